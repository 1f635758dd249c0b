package wire

import (
	"hash/crc32"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/reflect/protoreflect"
)

const (
	// ChunkBytes is the largest chunk that the contract allows.
	ChunkBytes = 1 << 20
	// sendBytes is the size of the chunks sent: large enough for speed, small enough to share a connection.
	sendBytes = 256 << 10
	// announceFrom is the size from which an array travels in chunks; smaller ones stay in the head.
	announceFrom = 4 << 10
)

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

// parcel is an array taken out of a message, to travel in chunks.
type parcel struct {
	id   uint32
	data []byte
}

// unload replaces the large arrays of a message by announcements and returns them. The message is changed.
func unload(m proto.Message) []parcel {
	var parcels []parcel
	eachArray(m.ProtoReflect(), func(a *towpathv1.Array) {
		if data := a.GetData(); len(data) >= announceFrom {
			p := parcel{uint32(len(parcels)), data}
			a.Place = &towpathv1.Array_Upload{Upload: &towpathv1.Upload{Id: p.id, SizeBytes: uint64(len(data))}}
			parcels = append(parcels, p)
		}
	})
	return parcels
}

// send cuts the parcel and hands its chunks to send, in order.
func (p parcel) send(send func(*towpathv1.Chunk) error) error {
	for at := 0; at < len(p.data); at += sendBytes {
		part := p.data[at:min(at+sendBytes, len(p.data))]
		if err := send(&towpathv1.Chunk{Array: p.id, OffsetBytes: uint64(at), Data: part, Crc32C: crc32.Checksum(part, castagnoli)}); err != nil {
			return err
		}
	}
	return nil
}

// eachArray visits every Array of a message in the order of its fields.
func eachArray(m protoreflect.Message, visit func(*towpathv1.Array)) {
	if a, ok := m.Interface().(*towpathv1.Array); ok {
		visit(a)
		return
	}
	fields := m.Descriptor().Fields()
	for i := range fields.Len() {
		f := fields.Get(i)
		if f.Kind() != protoreflect.MessageKind || f.IsMap() || !m.Has(f) {
			continue
		}
		if !f.IsList() {
			eachArray(m.Mutable(f).Message(), visit)
			continue
		}
		list := m.Mutable(f).List()
		for k := range list.Len() {
			eachArray(list.Get(k).Message(), visit)
		}
	}
}
