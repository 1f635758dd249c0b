package wire

import (
	"errors"
	"fmt"
	"hash/crc32"
	"io"

	"towpath/model"
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

// Parcel is an array taken out of a message, to travel in chunks.
type Parcel struct {
	id   uint32
	data []byte
}

// Unload replaces the large arrays of a message by announcements and returns them. The message is changed.
func Unload(m proto.Message) []Parcel {
	var parcels []Parcel
	eachArray(m.ProtoReflect(), func(a *towpathv1.Array) {
		if data := a.GetData(); len(data) >= announceFrom {
			p := Parcel{uint32(len(parcels)), data}
			a.Place = &towpathv1.Array_Upload{Upload: &towpathv1.Upload{Id: p.id, SizeBytes: uint64(len(data))}}
			parcels = append(parcels, p)
		}
	})
	return parcels
}

// Send cuts the parcel and hands its chunks to send, in order.
func (p Parcel) Send(send func(*towpathv1.Chunk) error) error {
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

// Collector puts a message together again from its head and its chunks.
type Collector struct {
	waiting map[uint32]*arrival
	order   []uint32
}

// arrival is an announced array and what came of it so far.
type arrival struct {
	array *towpathv1.Array
	data  []byte // of full length
	have  int
}

// NewCollector reads the announcements of a head, which it fills in the end. The announced sizes are checked against the
// limit before anything is allocated; then every array is allocated once.
func NewCollector(head proto.Message, limit uint64) (*Collector, error) {
	c := &Collector{waiting: map[uint32]*arrival{}}
	var total uint64
	var err error
	var sizes []uint64
	eachArray(head.ProtoReflect(), func(a *towpathv1.Array) {
		u := a.GetUpload()
		if u == nil || err != nil {
			return
		}
		if c.waiting[u.GetId()] != nil {
			err = uploadFault(u.GetId(), "it is announced twice", "give every array its own number")
			return
		}
		if u.GetSizeBytes() > limit-total {
			err = &TooLargeError{Limit: limit}
			return
		}
		total += u.GetSizeBytes()
		c.waiting[u.GetId()] = &arrival{array: a}
		c.order, sizes = append(c.order, u.GetId()), append(sizes, u.GetSizeBytes())
	})
	if err != nil {
		return nil, err
	}
	for i, id := range c.order {
		c.waiting[id].data = make([]byte, sizes[i])
	}
	return c, nil
}

// TooLargeError says that a message announces more than is taken.
type TooLargeError struct{ Limit uint64 }

func (e *TooLargeError) Error() string {
	return fmt.Sprintf("the announced arrays are larger than the %d bytes taken; split the model, or ask for a higher limit", e.Limit)
}

func uploadFault(id uint32, problem, cure string) error {
	return &model.FaultError{Faults: []model.Fault{{Path: "chunk", Place: fmt.Sprintf("array %d", id), Problem: problem, Cure: cure}}}
}

// Add takes the next chunk.
func (c *Collector) Add(k *towpathv1.Chunk) error {
	a, at := c.waiting[k.GetArray()], k.GetOffsetBytes()
	switch {
	case a == nil:
		return uploadFault(k.GetArray(), "it has a chunk but was not announced", "announce every array in the head")
	case len(k.GetData()) > ChunkBytes:
		return uploadFault(k.GetArray(), fmt.Sprintf("a chunk has %d bytes", len(k.GetData())), fmt.Sprintf("send at most %d", ChunkBytes))
	case len(k.GetData()) == 0:
		return uploadFault(k.GetArray(), "a chunk is empty", "leave it out")
	case at != uint64(a.have):
		return uploadFault(k.GetArray(), fmt.Sprintf("a chunk at byte %d follows byte %d", at, a.have), "send the chunks of an array in order, without gaps")
	case len(k.GetData()) > len(a.data)-a.have:
		return uploadFault(k.GetArray(), fmt.Sprintf("its chunks exceed the announced %d bytes", len(a.data)), "announce the true size")
	case crc32.Checksum(k.GetData(), castagnoli) != k.GetCrc32C():
		return uploadFault(k.GetArray(), fmt.Sprintf("the chunk at byte %d does not match its checksum", at), "send it again; the checksum is CRC-32C")
	}
	a.have += copy(a.data[a.have:], k.GetData())
	return nil
}

// Finish fills the head's announcements with what came.
func (c *Collector) Finish() error {
	for _, id := range c.order {
		a := c.waiting[id]
		if a.have != len(a.data) {
			return uploadFault(id, fmt.Sprintf("it ends after %d of %d bytes", a.have, len(a.data)), "send all chunks before closing the stream")
		}
		a.array.Place = &towpathv1.Array_Data{Data: a.data}
	}
	return nil
}

// ReceiveAnswer puts an answer together from its stream.
func ReceiveAnswer(recv func() (*towpathv1.FetchAnswerResponse, error)) (*towpathv1.Answer, error) {
	const limit = 16 << 30 // what a broker may make this process allocate
	first, err := recv()
	if errors.Is(err, io.EOF) {
		return nil, errors.New("the broker sent no answer")
	}
	if err != nil {
		return nil, err
	}
	head := first.GetHead()
	if head == nil {
		return nil, errors.New("the answer's stream does not begin with its head")
	}
	c, err := NewCollector(head, limit)
	if err != nil {
		return nil, err
	}
	for {
		next, err := recv()
		if errors.Is(err, io.EOF) {
			return head, c.Finish()
		}
		if err != nil {
			return nil, err
		}
		if next.GetChunk() == nil {
			return nil, errors.New("the answer's stream has a second head")
		}
		if err := c.Add(next.GetChunk()); err != nil {
			return nil, err
		}
	}
}
