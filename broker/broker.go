// Package broker is the service: it takes models as jobs, routes them, has them solved, lifted and examined, and keeps
// the answers. The gRPC services are thin; the life of a job is in jobs.go, the way of a model in pipeline.go.
package broker

import (
	"context"
	"sync"
	"time"

	"towpath/backends"
	"towpath/broker/store"

	"go.uber.org/zap"
)

// Absent is a back end that this machine could have but has not.
type Absent struct {
	Backend string
	Cure    string // what would help, like "install the Debian package coinor-csdp"
}

// Broker is the service over one store. Start it, serve it, stop it; stopping twice is fine.
type Broker struct {
	cfg     Config
	planner *planner
	absent  []Absent
	log     *zap.Logger
	records store.Records
	blobs   store.Blobs

	mu      sync.Mutex
	work    *sync.Cond           // the queue has grown, or the broker drains
	queue   []string             // jobs waiting, oldest first
	live    map[string]*liveJob  // every job in the store
	ended   []string             // of these, the ended ones, oldest first
	models  map[string]*modelUse // every model in the store
	running int
	drains  bool

	drained chan struct{} // closed when streams should end
	workers sync.WaitGroup
	stop    context.CancelFunc // of everything that runs
	ctx     context.Context
	once    sync.Once
}

// liveJob is what this process knows of a job beside its record.
type liveJob struct {
	feed    *feed
	cancel  context.CancelCauseFunc // of the running solve; nil when none runs
	expiry  *time.Timer
	request string // request_id, if any
	model   string
	done    chan struct{} // closed when it has ended
}

// modelUse counts what keeps a model in the store.
type modelUse struct {
	jobs  int
	until time.Time // kept without jobs
}

// New makes a broker over an empty in-memory store and starts its workers.
func New(cfg Config, drivers []backends.Driver, absent []Absent, log *zap.Logger) (*Broker, error) {
	if err := cfg.validate(); err != nil {
		return nil, err
	}
	cfg = cfg.withDefaults()
	p, err := newPlanner(drivers, cfg.Catalogue)
	if err != nil {
		return nil, err
	}
	memory := store.NewMemory(cfg.StoreLimit)
	ctx, stop := context.WithCancel(context.Background())
	b := &Broker{
		cfg: cfg, planner: p, absent: absent, log: log, records: memory, blobs: memory.Blobs(),
		live: map[string]*liveJob{}, models: map[string]*modelUse{}, drained: make(chan struct{}), ctx: ctx, stop: stop,
	}
	b.work = sync.NewCond(&b.mu)
	for _, s := range p.sheets {
		log.Info("back end registered", zap.String("sheet", s.Name), zap.String("version", s.Version))
	}
	for _, a := range absent {
		log.Warn("back end absent", zap.String("backend", a.Backend), zap.String("cure", a.Cure))
	}
	for range cfg.Workers {
		b.workers.Go(b.worker)
	}
	b.workers.Go(b.janitor)
	return b, nil
}

// Stop drains the broker: no new jobs, running solves get the grace to finish and are then stopped, waiting jobs fail
// with reason DRAINING, streams end. It may be called more than once.
func (b *Broker) Stop() {
	b.once.Do(func() {
		b.mu.Lock()
		b.drains = true
		b.work.Broadcast()
		b.mu.Unlock()
		b.log.Info("draining", zap.Duration("grace", b.cfg.Grace))
		finished := make(chan struct{})
		go func() {
			for b.busy() {
				time.Sleep(time.Millisecond)
			}
			close(finished)
		}()
		select {
		case <-finished:
		case <-time.After(b.cfg.Grace):
		}
		b.stop()
		b.workers.Wait()
		b.mu.Lock()
		waiting := b.queue
		b.queue = nil
		b.mu.Unlock()
		for _, id := range waiting {
			b.fail(id, Draining, "the server stopped before a worker was free; submit again")
		}
		close(b.drained)
		b.log.Info("drained")
	})
}

func (b *Broker) busy() bool {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.running > 0
}

// janitor removes uploaded models that no job uses when their time is over.
func (b *Broker) janitor() {
	tick := time.NewTicker(max(b.cfg.ModelLifetime/10, time.Second))
	defer tick.Stop()
	for {
		select {
		case <-b.ctx.Done():
			return
		case now := <-tick.C:
			b.mu.Lock()
			for id, use := range b.models {
				if use.jobs == 0 && now.After(use.until) {
					b.forgetModel(id)
				}
			}
			b.mu.Unlock()
		}
	}
}

// forgetModel removes a model from the store; b.mu is held.
func (b *Broker) forgetModel(id string) {
	delete(b.models, id)
	if err := b.blobs.Delete(context.Background(), modelKey(id)); err != nil {
		b.log.Error("removing a model", zap.String("model", id), zap.Error(err))
	}
}
