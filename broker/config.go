package broker

import (
	"fmt"
	"runtime"
	"time"

	"towpath/bridges"
	"towpath/model/check"
)

// Config of a broker. Zero values take the defaults in brackets.
type Config struct {
	Workers       int              // solves at a time [number of processors]
	QueueLimit    int              // jobs waiting at a time, more are refused [1000]
	UploadLimit   uint64           // bytes of one uploaded model [4 GiB]
	StoreLimit    int64            // bytes of models and answers kept together [8 GiB]
	Retain        int              // ended jobs kept, the oldest go first [1000]
	ModelLifetime time.Duration    // how long an uploaded model that no job uses is kept [1 h]
	RunLimit      time.Duration    // longest solve a job may ask for, and the default [1 h]
	LifeLimit     time.Duration    // longest life a job may ask for, and the default [24 h]
	MemoryLimit   uint64           // bytes of one solve a job may ask for, and the default; 0 is no limit
	Grace         time.Duration    // how long running solves may go on when the broker stops [10 s]
	Idle          time.Duration    // how long a watch stream stays silent at most [15 s]
	Tolerance     float64          // of examinations, unless the job says [check.DefaultResidual]
	Catalogue     []bridges.Bridge // bridges to use [bridges.All()]
}

// withDefaults fills what is zero.
func (c Config) withDefaults() Config {
	set(&c.Workers, runtime.NumCPU())
	set(&c.QueueLimit, 1000)
	set(&c.UploadLimit, 4<<30)
	set(&c.StoreLimit, 8<<30)
	set(&c.Retain, 1000)
	set(&c.ModelLifetime, time.Hour)
	set(&c.RunLimit, time.Hour)
	set(&c.LifeLimit, 24*time.Hour)
	set(&c.Grace, 10*time.Second)
	set(&c.Idle, 15*time.Second)
	set(&c.Tolerance, check.DefaultResidual)
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
		{"ModelLifetime", c.ModelLifetime < 0}, {"RunLimit", c.RunLimit < 0}, {"LifeLimit", c.LifeLimit < 0}, {"Grace", c.Grace < 0},
		{"Idle", c.Idle < 0}, {"Tolerance", !(c.Tolerance >= 0 && c.Tolerance < 1)},
	} {
		if x.bad {
			return fmt.Errorf("broker configuration: %s is negative or out of range", x.name)
		}
	}
	return nil
}
