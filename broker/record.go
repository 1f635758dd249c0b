package broker

import (
	"encoding/json"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// record is what the store keeps of a job: the only truth about it.
type record struct {
	Job    *towpathv1.Job
	Model  string // blob of the model
	Answer string // blob of the answer, once there is one
}

// stored is a record's form in the store.
type stored struct {
	Job    []byte `json:"job"`
	Model  string `json:"model"`
	Answer string `json:"answer,omitempty"`
}

func (r *record) encode() ([]byte, error) {
	job, err := proto.Marshal(r.Job)
	if err != nil {
		return nil, err
	}
	return json.Marshal(stored{job, r.Model, r.Answer})
}

func decodeRecord(raw []byte) (*record, error) {
	var s stored
	if err := json.Unmarshal(raw, &s); err != nil {
		return nil, err
	}
	r := &record{Job: &towpathv1.Job{}, Model: s.Model, Answer: s.Answer}
	return r, proto.Unmarshal(s.Job, r.Job)
}

// ended reports whether a state is final.
func ended(s towpathv1.JobState) bool {
	switch s {
	case towpathv1.JobState_JOB_STATE_ANSWERED, towpathv1.JobState_JOB_STATE_FAILED,
		towpathv1.JobState_JOB_STATE_WITHDRAWN, towpathv1.JobState_JOB_STATE_EXPIRED:
		return true
	}
	return false
}

// Keys in the store.
func jobKey(id string) string       { return "job/" + id }
func requestKey(id string) string   { return "request/" + id }
func modelKey(id string) string     { return "model/" + id }
func answerKey(jobID string) string { return "answer/" + jobID }
