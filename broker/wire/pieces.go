package wire

import (
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/reflect/protoreflect"
)

// headBytes is the largest piece of a head sent: half of gRPC's usual limit for one message.
const headBytes = 2 << 20

// pieces cuts a message into messages of at most limit bytes, as far as its lists allow, which merged in order make it
// again. A message within the limit is returned as it is.
func pieces[M proto.Message](m M, limit int) []M {
	if proto.Size(m) <= limit {
		return []M{m}
	}
	c := &cutter{whole: m.ProtoReflect(), limit: limit}
	c.next()
	c.cut(c.whole, nil)
	var out []M
	for _, p := range c.pieces {
		out = append(out, p.Interface().(M))
	}
	return out
}

// cutter fills one piece after the other.
type cutter struct {
	whole  protoreflect.Message
	limit  int
	pieces []protoreflect.Message
	size   int // of the last piece, roughly
}

func (c *cutter) next() {
	c.pieces, c.size = append(c.pieces, c.whole.New()), 0
}

// framing is what a part costs beyond its own bytes: tags and lengths of it and of what it lies in.
const framing = 32

// room returns the message at the path in a piece that has room for n more bytes.
func (c *cutter) room(n int, path []protoreflect.FieldDescriptor) protoreflect.Message {
	if c.size > 0 && c.size+n+framing > c.limit {
		c.next()
	}
	c.size += n + framing
	at := c.pieces[len(c.pieces)-1]
	for _, f := range path {
		at = at.Mutable(f).Message()
	}
	return at
}

// cut distributes the fields of from, which lies at the path: lists of messages by their elements, large messages by
// their fields, everything else whole.
func (c *cutter) cut(from protoreflect.Message, path []protoreflect.FieldDescriptor) {
	fields := from.Descriptor().Fields()
	for i := range fields.Len() {
		f := fields.Get(i)
		if !from.Has(f) {
			continue
		}
		v := from.Get(f)
		switch {
		case f.IsList() && f.Kind() == protoreflect.MessageKind:
			for k := range v.List().Len() {
				e := v.List().Get(k)
				c.room(proto.Size(e.Message().Interface()), path).Mutable(f).List().Append(e)
			}
		case f.Kind() == protoreflect.MessageKind && !f.IsList() && !f.IsMap():
			if n := proto.Size(v.Message().Interface()); n <= c.limit/2 {
				c.room(n, path).Set(f, v)
			} else {
				c.cut(v.Message(), append(path[:len(path):len(path)], f))
			}
		default:
			alone := from.New()
			alone.Set(f, v)
			c.room(proto.Size(alone.Interface()), path).Set(f, v)
		}
	}
}

// SendModel sends a model as its stream wants it: the head in one or more messages, then the chunks of its large arrays.
// The model is changed.
func SendModel(m *towpathv1.Model, send func(*towpathv1.UploadModelRequest) error) error {
	parcels := unload(m)
	for k, p := range pieces(m, headBytes) {
		q := &towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Head{Head: p}}
		if k > 0 {
			q.Part = &towpathv1.UploadModelRequest_More{More: p}
		}
		if err := send(q); err != nil {
			return err
		}
	}
	return sendParcels(parcels, func(c *towpathv1.Chunk) error {
		return send(&towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Chunk{Chunk: c}})
	})
}

// SendAnswer sends an answer likewise. The answer is changed.
func SendAnswer(a *towpathv1.Answer, send func(*towpathv1.FetchAnswerResponse) error) error {
	parcels := unload(a)
	for k, p := range pieces(a, headBytes) {
		r := &towpathv1.FetchAnswerResponse{Part: &towpathv1.FetchAnswerResponse_Head{Head: p}}
		if k > 0 {
			r.Part = &towpathv1.FetchAnswerResponse_More{More: p}
		}
		if err := send(r); err != nil {
			return err
		}
	}
	return sendParcels(parcels, func(c *towpathv1.Chunk) error {
		return send(&towpathv1.FetchAnswerResponse{Part: &towpathv1.FetchAnswerResponse_Chunk{Chunk: c}})
	})
}

func sendParcels(parcels []parcel, send func(*towpathv1.Chunk) error) error {
	for _, p := range parcels {
		if err := p.send(send); err != nil {
			return err
		}
	}
	return nil
}
