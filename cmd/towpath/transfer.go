package main

import (
	"errors"
	"fmt"
	"hash/crc32"
	"io"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/reflect/protoreflect"
)

const (
	// inlineLimit is the size up to which a model travels inside its request: well under gRPC's limit of 4 MiB for one
	// message, which also has to hold the options.
	inlineLimit = 3 << 20
	// announceFrom is the size from which an array travels in chunks; smaller ones stay in the head.
	announceFrom = 4 << 10
	// chunkBytes is the largest chunk that the wire contract allows.
	chunkBytes = 1 << 20
)

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

// parcel is an array taken out of a message, to be sent in chunks.
type parcel struct {
	id   uint32
	data []byte
}

// unload replaces the large arrays of a message by announcements and returns them. The message is changed.
func unload(m proto.Message) []parcel {
	var parcels []parcel
	eachArray(m.ProtoReflect(), func(a *towpathv1.Array) {
		if data := a.GetData(); len(data) >= announceFrom {
			p := parcel{id: uint32(len(parcels)), data: data}
			a.Place = &towpathv1.Array_Upload{Upload: &towpathv1.Upload{Id: p.id, SizeBytes: uint64(len(data))}}
			parcels = append(parcels, p)
		}
	})
	return parcels
}

// sendChunks cuts a parcel and hands the chunks to send in order.
func (p parcel) sendChunks(send func(*towpathv1.Chunk) error) error {
	for at := 0; at < len(p.data); at += chunkBytes {
		part := p.data[at:min(at+chunkBytes, len(p.data))]
		err := send(&towpathv1.Chunk{Array: p.id, OffsetBytes: uint64(at), Data: part, Crc32C: crc32.Checksum(part, castagnoli)})
		if err != nil {
			return err
		}
	}
	return nil
}

// largestAnswer bounds what a broker can make this process allocate for one answer.
const largestAnswer = 8 << 30

// receiveAnswer puts an answer together from its stream.
func receiveAnswer(recv func() (*towpathv1.FetchAnswerResponse, error)) (*towpathv1.Answer, error) {
	first, err := recv()
	if errors.Is(err, io.EOF) {
		return nil, errors.New("the broker sent no answer")
	}
	if err != nil {
		return nil, err
	}
	answer := first.GetHead()
	if answer == nil {
		return nil, errors.New("the answer's stream does not begin with its head")
	}
	type pending struct {
		array *towpathv1.Array
		size  uint64
		data  []byte
	}
	waiting := map[uint32]*pending{}
	total := uint64(0)
	eachArray(answer.ProtoReflect(), func(a *towpathv1.Array) {
		if u := a.GetUpload(); u != nil {
			waiting[u.GetId()] = &pending{array: a, size: u.GetSizeBytes()}
			total += min(u.GetSizeBytes(), largestAnswer)
		}
	})
	if total > largestAnswer {
		return nil, fmt.Errorf("the answer announces %s; at most %s are taken", bytesText(float64(total)), bytesText(largestAnswer))
	}
	for {
		message, err := recv()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return nil, err
		}
		c := message.GetChunk()
		p := waiting[c.GetArray()]
		switch {
		case c == nil:
			return nil, errors.New("the answer's stream has a second head")
		case p == nil:
			return nil, fmt.Errorf("the answer's stream has a chunk of array %d, which was not announced", c.GetArray())
		case c.GetOffsetBytes() != uint64(len(p.data)) || uint64(len(p.data)+len(c.GetData())) > p.size:
			return nil, fmt.Errorf("array %d of the answer: chunk at %d does not fit", c.GetArray(), c.GetOffsetBytes())
		case crc32.Checksum(c.GetData(), castagnoli) != c.GetCrc32C():
			return nil, fmt.Errorf("array %d of the answer: chunk at %d was damaged on its way", c.GetArray(), c.GetOffsetBytes())
		}
		p.data = append(p.data, c.GetData()...)
	}
	for id, p := range waiting {
		if uint64(len(p.data)) != p.size {
			return nil, fmt.Errorf("array %d of the answer ends after %d of %d bytes", id, len(p.data), p.size)
		}
		p.array.Place = &towpathv1.Array_Data{Data: p.data}
	}
	return answer, nil
}

// eachArray visits every Array in a message, in the order of fields.
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
