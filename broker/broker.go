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

// Broker is the service over one store. Serve it with NewServer; Stop it, twice if you like.
type Broker struct {
	cfg     Config
	planner *planner
	absent  []Absent
	log     *zap.Logger
	records store.Records
	blobs   store.Blobs

	mu        sync.Mutex
	work      *sync.Cond           // the queue has grown, or the broker drains
	queue     []string             // jobs waiting, oldest first
	live      map[string]*liveJob  // every job in the store
	ended     []string             // of these, the ended ones, oldest first
	models    map[string]*modelUse // every model in the store
	uploading int64                // bytes of uploads in progress
	drains    bool

	drained chan struct{} // closed when streams should end
	workers sync.WaitGroup
	janitor sync.WaitGroup
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

// New makes a broker over an empty in-memory store and starts its workers. It keeps drivers, absent and the logger.
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
	log.Info("broker started", zap.Int("workers", cfg.Workers), zap.Int("queue_limit", cfg.QueueLimit), zap.Int("retain", cfg.Retain),
		zap.Int64("store_limit_bytes", cfg.StoreLimit), zap.Uint64("memory_limit_bytes", cfg.MemoryLimit))
	for range cfg.Workers {
		b.workers.Go(b.worker)
	}
	b.janitor.Go(b.tidy)
	return b, nil
}

// deaf is how long a back end may take to return once its solve was called off; the contract says one iteration.
const deaf = 5 * time.Second

// Stop drains the broker: no new jobs; waiting jobs fail with reason DRAINED; running solves get the grace to finish and
// are then called off, their jobs failing likewise; then streams end. It may be called more than once, and returns when
// all is done. Only a back end that does not obey is left behind, and named in the log.
func (b *Broker) Stop() {
	b.once.Do(func() {
		b.log.Info("draining", zap.Duration("grace", b.cfg.Grace))
		b.mu.Lock()
		b.drains = true
		waiting := b.queue
		b.queue = nil
		b.work.Broadcast()
		b.mu.Unlock()
		for _, id := range waiting {
			b.fail(id, Drained, "the server stopped before a worker was free; submit again")
		}
		idle := make(chan struct{})
		go func() {
			b.workers.Wait()
			close(idle)
		}()
		if !within(idle, b.cfg.Grace) {
			b.stop()
			if !within(idle, deaf) {
				b.log.Error("a back end goes on although it was told to stop")
			}
		}
		b.stop()
		b.janitor.Wait()
		for _, id := range b.unended() {
			b.fail(id, Drained, "the server stopped during the solve; submit again")
		}
		close(b.drained)
		b.log.Info("drained")
	})
}

// within reports whether a channel is closed in time.
func within(c <-chan struct{}, d time.Duration) bool {
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-c:
		return true
	case <-t.C:
		return false
	}
}

// unended lists the jobs that have not ended, in no order.
func (b *Broker) unended() (ids []string) {
	b.mu.Lock()
	defer b.mu.Unlock()
	for id, l := range b.live {
		select {
		case <-l.done:
		default:
			ids = append(ids, id)
		}
	}
	return ids
}

// tidy removes uploaded models that no job uses when their time is over.
func (b *Broker) tidy() {
	tick := time.NewTicker(max(b.cfg.ModelLifetime/10, time.Millisecond))
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
