package wire

import (
	"errors"
	"fmt"
	"io"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

const (
	// largestHead bounds the head of a stream, in bytes on the wire: what is not in arrays.
	largestHead = 64 << 20
	// largestAnswer bounds what a broker may make a client allocate.
	largestAnswer = 16 << 30
)

// part is one message of a stream: one of the three, nil when it is neither.
type part struct {
	head, more proto.Message
	chunk      *towpathv1.Chunk
	parts      int // messages within a piece of the head, roughly
}

// partBytes is the memory that a message takes beyond its bytes on the wire: the largest of Term, Block and Constraint as
// generated has about so many.
const partBytes = 256

func streamError(place, problem, cure string) error {
	return &StreamError{model.Fault{Path: "part", Place: place, Problem: problem, Cure: cure}}
}

// ReceiveModel puts an uploaded model together from its stream. The announced sizes are checked against the limit, and
// reserve is asked for room, for every piece of the head and for the arrays, before they are put together. Errors of the stream itself are *StreamError and
// *TooLargeError; those of recv and reserve are returned as they are.
func ReceiveModel(recv func() (*towpathv1.UploadModelRequest, error), limit uint64, reserve func(bytes uint64) error) (*towpathv1.Model, error) {
	m := &towpathv1.Model{}
	return m, receive(m, limit, reserve, func() (p part, err error) {
		q, err := recv()
		switch x := q.GetPart().(type) {
		case *towpathv1.UploadModelRequest_Head:
			p.head, p.parts = x.Head, modelParts(x.Head)
		case *towpathv1.UploadModelRequest_More:
			p.more, p.parts = x.More, modelParts(x.More)
		case *towpathv1.UploadModelRequest_Chunk:
			p.chunk = x.Chunk
		}
		return p, err
	})
}

func modelParts(m *towpathv1.Model) int {
	n := len(m.GetBlocks()) + len(m.GetConstraints()) + len(m.GetObjective().GetTerms())
	for _, c := range m.GetConstraints() {
		n += len(c.GetTerms())
	}
	return n
}

// ReceiveAnswer puts an answer together from its stream.
func ReceiveAnswer(recv func() (*towpathv1.FetchAnswerResponse, error)) (*towpathv1.Answer, error) {
	a := &towpathv1.Answer{}
	return a, receive(a, largestAnswer, func(uint64) error { return nil }, func() (p part, err error) {
		r, err := recv()
		switch x := r.GetPart().(type) {
		case *towpathv1.FetchAnswerResponse_Head:
			p.head = x.Head
		case *towpathv1.FetchAnswerResponse_More:
			p.more = x.More
		case *towpathv1.FetchAnswerResponse_Chunk:
			p.chunk = x.Chunk
		}
		return p, err
	})
}

// receive fills into from a stream: head, more of it, chunks, end.
func receive(into proto.Message, limit uint64, reserve func(uint64) error, next func() (part, error)) error {
	p, err := next()
	switch {
	case errors.Is(err, io.EOF):
		return streamError("the stream", "it is empty", "send the head first")
	case err != nil:
		return err
	case p.head == nil:
		return streamError("the stream", "it does not begin with a head", "send the head first")
	}
	size := 0
	for piece := p.head; piece != nil; piece = p.more {
		n := proto.Size(piece)
		if size += n; size > largestHead {
			return streamError("the head", fmt.Sprintf("it has more than %d bytes", largestHead), "put coefficients and numbers into arrays")
		}
		if err := reserve(uint64(n + p.parts*partBytes)); err != nil {
			return err
		}
		proto.Merge(into, piece)
		if p, err = next(); err != nil {
			break
		}
	}
	if err != nil && !errors.Is(err, io.EOF) {
		return err
	}
	c, faulty := newCollector(into, limit)
	if faulty != nil {
		return faulty
	}
	if faulty := reserve(c.total); faulty != nil {
		return faulty
	}
	for ; err == nil; p, err = next() {
		if p.chunk == nil {
			return streamError("the stream", "after the head and its chunks there is another part", "send one head, more of it, then chunks")
		}
		if err := c.add(p.chunk); err != nil {
			return err
		}
	}
	if !errors.Is(err, io.EOF) {
		return err
	}
	return c.finish()
}
