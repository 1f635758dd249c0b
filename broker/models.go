package broker

import (
	"context"
	"errors"
	"time"

	"towpath/broker/store"
	"towpath/broker/wire"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/proto"
)

// admit decodes and validates a client's model.
func admit(p *towpathv1.Model) (*model.Model, error) {
	m, err := wire.ModelFromProto(p)
	if err != nil {
		return nil, err
	}
	return m, m.Validate()
}

// keepModel puts a valid model into the store and counts a use of it: by a job, or by a client until its lifetime ends.
func (b *Broker) keepModel(ctx context.Context, p *towpathv1.Model, m *model.Model, forJob bool) (id string, until time.Time, err error) {
	id = wire.ModelID(m)
	until = time.Now().Add(b.cfg.ModelLifetime)
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.models[id] == nil {
		raw, err := proto.Marshal(p)
		if err != nil {
			return "", until, refuse(codes.ResourceExhausted, ModelTooLarge, "the model is too large to keep: %v; split it", err)
		}
		if err := b.blobs.Put(ctx, modelKey(id), raw); err != nil {
			return "", until, err
		}
		b.models[id] = &modelUse{}
	}
	if forJob {
		b.models[id].jobs++
	} else {
		b.models[id].until = until
	}
	return id, until, nil
}

// claimModel counts a job's use of a model that was uploaded before.
func (b *Broker) claimModel(id string) error {
	b.mu.Lock()
	defer b.mu.Unlock()
	use := b.models[id]
	if use == nil {
		return unknownModel(id)
	}
	use.jobs++
	return nil
}

func unknownModel(id string) error {
	return refuse(codes.NotFound, UnknownModel, "there is no uploaded model '%s'; uploaded models are kept for a while only: upload it again", id)
}

// releaseModel gives up a use that came to nothing.
func (b *Broker) releaseModel(id string) {
	b.mu.Lock()
	defer b.mu.Unlock()
	b.release(id)
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
