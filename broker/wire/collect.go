package wire

import (
	"fmt"
	"hash/crc32"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// StreamError says where a stream does not follow the contract.
type StreamError struct{ Fault model.Fault }

// Error is the sentence for people.
func (e *StreamError) Error() string { return e.Fault.String() }

// TooLargeError says that a message announces more than is taken.
type TooLargeError struct{ Limit uint64 }

// Error is the sentence for people.
func (e *TooLargeError) Error() string {
	return fmt.Sprintf("the announced arrays are larger than the %d bytes taken; split the model, or ask for a higher limit", e.Limit)
}

// collector fills the announced arrays of a head from its chunks.
type collector struct {
	waiting map[uint32]*arrival
	order   []uint32
	total   uint64 // bytes announced
}

// arrival is an announced array and what came of it so far.
type arrival struct {
	array *towpathv1.Array
	size  uint64
	data  []byte // of full length, once there is a chunk
	have  int
}

// newCollector reads the announcements of a head. Their sum is checked against the limit before anything is allocated.
func newCollector(head proto.Message, limit uint64) (*collector, error) {
	c := &collector{waiting: map[uint32]*arrival{}}
	var err error
	eachArray(head.ProtoReflect(), func(a *towpathv1.Array) {
		u := a.GetUpload()
		switch {
		case u == nil || err != nil:
		case c.waiting[u.GetId()] != nil:
			err = arrayError(u.GetId(), "it is announced twice", "give every array its own number")
		case u.GetSizeBytes() > limit-c.total:
			err = &TooLargeError{Limit: limit}
		default:
			c.total += u.GetSizeBytes()
			c.waiting[u.GetId()] = &arrival{array: a, size: u.GetSizeBytes()}
			c.order = append(c.order, u.GetId())
		}
	})
	return c, err
}

func arrayError(id uint32, problem, cure string) error {
	return &StreamError{model.Fault{Path: "chunk", Place: fmt.Sprintf("array %d", id), Problem: problem, Cure: cure}}
}

// add takes the next chunk. The first chunk of an array allocates all of it.
func (c *collector) add(k *towpathv1.Chunk) error {
	id, data := k.GetArray(), k.GetData()
	a := c.waiting[id]
	switch {
	case a == nil:
		return arrayError(id, "it has a chunk but was not announced", "announce every array in the head")
	case len(data) > ChunkBytes:
		return arrayError(id, fmt.Sprintf("a chunk has %d bytes", len(data)), fmt.Sprintf("send at most %d", ChunkBytes))
	case len(data) == 0:
		return arrayError(id, "a chunk is empty", "leave it out")
	case k.GetOffsetBytes() != uint64(a.have):
		return arrayError(id, fmt.Sprintf("a chunk at byte %d follows byte %d", k.GetOffsetBytes(), a.have), "send the chunks of an array in order, without gaps")
	case uint64(len(data)) > a.size-uint64(a.have):
		return arrayError(id, fmt.Sprintf("its chunks exceed the announced %d bytes", a.size), "announce the true size")
	case crc32.Checksum(data, castagnoli) != k.GetCrc32C():
		return arrayError(id, fmt.Sprintf("the chunk at byte %d does not match its checksum", a.have), "send it again; the checksum is CRC-32C")
	}
	if a.data == nil {
		a.data = make([]byte, a.size)
	}
	a.have += copy(a.data[a.have:], data)
	return nil
}

// finish fills the head's announcements with what came.
func (c *collector) finish() error {
	for _, id := range c.order {
		a := c.waiting[id]
		if uint64(a.have) != a.size {
			return arrayError(id, fmt.Sprintf("it ends after %d of %d bytes", a.have, a.size), "send all chunks before closing the stream")
		}
		a.array.Place = &towpathv1.Array_Data{Data: a.data}
	}
	return nil
}
