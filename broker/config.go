package broker

import (
	"fmt"
	"math"
	"runtime"
	"time"

	"towpath/bridges"
	"towpath/model/check"
)

// Config of a broker. Zero values take the defaults in brackets.
type Config struct {
	Workers       int              // solves at a time [number of processors]
	QueueLimit    int              // jobs waiting at a time, more are refused [1000]
	Retain        int              // ended jobs kept, the oldest go first [1000]
	StoreLimit    int64            // bytes of models and answers kept together, the oldest answers go first [2 GiB]
	UploadLimit   uint64           // bytes of the arrays of one uploaded model, at most 2 GB [1 GiB]; all uploads in progress share StoreLimit
	UploadPause   time.Duration    // silence after which an upload is given up, at the latest after twice the time [1 min]
	ModelLifetime time.Duration    // how long an uploaded model that no job uses is kept [1 h]
	RunLimit      time.Duration    // longest solve a job may ask for, and the default [1 h]
	LifeLimit     time.Duration    // longest life a job may ask for, and the default [24 h]
	MemoryLimit   uint64           // predicted bytes of one solve a job may ask for, and the default [this machine's, less StoreLimit, shared by Workers]
	Grace         time.Duration    // how long running solves may go on when the broker stops [10 s]
	Idle          time.Duration    // how long a watch stream stays silent at most [15 s]
	Tolerance     float64          // of examinations, unless the job says [check.DefaultResidual]
	Catalogue     []bridges.Bridge // bridges to use [bridges.All()]
}

// largestModel is what one protobuf message can hold, less what surrounds the arrays: the store keeps a model as one.
const largestModel = math.MaxInt32 - 128<<20

// withDefaults fills what is zero.
func (c Config) withDefaults() Config {
	set(&c.Workers, runtime.NumCPU())
	set(&c.QueueLimit, 1000)
	set(&c.Retain, 1000)
	set(&c.StoreLimit, 2<<30)
	set(&c.UploadLimit, 1<<30)
	set(&c.UploadPause, time.Minute)
	set(&c.ModelLifetime, time.Hour)
	set(&c.RunLimit, time.Hour)
	set(&c.LifeLimit, 24*time.Hour)
	set(&c.Grace, 10*time.Second)
	set(&c.Idle, 15*time.Second)
	set(&c.Tolerance, check.DefaultResidual)
	if c.MemoryLimit == 0 {
		// A model of a few bytes can ask for more memory than there is, and running out of it ends the process.
		c.MemoryLimit = (machineMemory() - min(uint64(c.StoreLimit), machineMemory()/2)) / uint64(c.Workers)
	}
	if c.Catalogue == nil {
		c.Catalogue = bridges.All()
	}
	return c
}

func set[T comparable](field *T, value T) {
	var zero T
	if *field == zero {
		*field = value
	}
}

// validate refuses what cannot work.
func (c Config) validate() error {
	for _, x := range []struct {
		name string
		bad  bool
	}{
		{"Workers", c.Workers < 0}, {"QueueLimit", c.QueueLimit < 0}, {"StoreLimit", c.StoreLimit < 0}, {"Retain", c.Retain < 0},
		{"UploadLimit", c.UploadLimit > largestModel}, {"UploadPause", c.UploadPause < 0}, {"MemoryLimit", c.MemoryLimit > math.MaxInt64},
		{"ModelLifetime", c.ModelLifetime < 0}, {"RunLimit", c.RunLimit < 0}, {"LifeLimit", c.LifeLimit < 0}, {"Grace", c.Grace < 0},
		{"Idle", c.Idle < 0}, {"Tolerance", !(c.Tolerance >= 0 && c.Tolerance < 1)},
	} {
		if x.bad {
			return fmt.Errorf("broker configuration: %s is negative or out of range", x.name)
		}
	}
	return nil
}
