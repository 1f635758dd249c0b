package broker

import (
	"context"
	"errors"
	"time"

	"towpath/broker/store"
	"towpath/broker/wire"
	"towpath/capability"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/proto"
)

// modelUse is what this process knows of a model in the store, and what keeps it there.
type modelUse struct {
	name    string
	demands []capability.Demand
	jobs    int
	until   time.Time // kept without jobs
}

// intake is a model as a request hands it in: validated, named, summarized.
type intake struct {
	id      string
	name    string
	demands []capability.Demand
	sent    *towpathv1.Model // nil when it was uploaded before
}

// admit decodes, validates and summarizes a client's model.
func admit(p *towpathv1.Model) (*intake, error) {
	m, err := wire.ModelFromProto(p)
	if err != nil {
		return nil, err
	}
	if err := m.Validate(); err != nil {
		return nil, err
	}
	return &intake{id: wire.ModelID(m), name: m.Name, demands: capability.Summarize(m), sent: p}, nil
}

// intake finds the model of a request. A model that was uploaded before is not read again: planning looks at demands.
func (b *Broker) intake(_ context.Context, p *towpathv1.Model, id string, given bool) (*intake, error) {
	if !given {
		return nil, invalid("source", "the request", "it has no model", "give model, or the model_id of an uploaded one")
	}
	if p != nil {
		return admit(p)
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	use := b.models[id]
	if use == nil {
		return nil, unknownModel(id)
	}
	return &intake{id: id, name: use.name, demands: use.demands}, nil
}

func unknownModel(id string) error {
	return refuse(codes.NotFound, UnknownModel, "there is no uploaded model '%s'; uploaded models are kept for a while only: upload it again", id)
}

// keepModel sees to it that a model is in the store and counts a use of it. Both happen under one lock, so that a model
// in use is never removed; what takes long is done before.
func (b *Broker) keepModel(ctx context.Context, in *intake, count func(*modelUse)) error {
	var raw []byte
	if in.sent != nil {
		var err error
		if raw, err = proto.Marshal(in.sent); err != nil {
			return refuse(codes.ResourceExhausted, ModelTooLarge, "the model is too large to keep: %v; split it", err)
		}
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.models[in.id] == nil {
		if raw == nil {
			return unknownModel(in.id) // it was there when the request came
		}
		if err := b.keep(ctx, modelKey(in.id), raw); err != nil {
			return err
		}
		b.models[in.id] = &modelUse{name: in.name, demands: in.demands}
	}
	count(b.models[in.id])
	return nil
}

// keep stores a blob. When there is no room, the oldest ended jobs are forgotten with their answers. b.mu is held.
func (b *Broker) keep(ctx context.Context, key string, raw []byte) error {
	for {
		err := b.blobs.Put(ctx, key, raw)
		if !errors.Is(err, store.ErrFull) || len(b.ended) == 0 {
			return err
		}
		b.forgetOldest()
	}
}

// release gives up one job's use of a model; b.mu is held.
func (b *Broker) release(id string) {
	use := b.models[id]
	if use == nil {
		return
	}
	if use.jobs--; use.jobs == 0 && time.Now().After(use.until) {
		b.forgetModel(id)
	}
}

// forgetModel removes a model from the store; b.mu is held.
func (b *Broker) forgetModel(id string) {
	delete(b.models, id)
	if err := b.blobs.Delete(context.Background(), modelKey(id)); err != nil {
		b.log.Error("removing a model", zap.String("model", id), zap.Error(err))
	}
}

// loadModel reads a model back from the store.
func (b *Broker) loadModel(ctx context.Context, id string) (*model.Model, error) {
	raw, err := b.blobs.Get(ctx, modelKey(id))
	if errors.Is(err, store.ErrMissing) {
		return nil, unknownModel(id)
	}
	if err != nil {
		return nil, err
	}
	p := &towpathv1.Model{}
	if err := proto.Unmarshal(raw, p); err != nil {
		return nil, err
	}
	return wire.ModelFromProto(p)
}
