package main

import (
	"fmt"
	"io"
	"time"

	towpathv1 "towpath/proto/towpath/v1"
)

// meter shows a running solve to people: one line that is written over on a terminal, a line per event otherwise.
type meter struct {
	w       io.Writer
	live    bool
	started time.Time
	width   int // of the line shown now
}

// quietFor keeps short solves from flickering on a terminal.
const quietFor = 500 * time.Millisecond

// newMeter returns a meter when somebody watches or asked for it, else nil.
func newMeter(io streams, asked bool) *meter {
	if !io.live && !asked {
		return nil
	}
	return &meter{w: io.err, live: io.live && !asked, started: time.Now()}
}

func (m *meter) event(e *towpathv1.WatchJobResponse) {
	text := eventText(e)
	if text == "" {
		return
	}
	if !m.live {
		fmt.Fprintln(m.w, text)
		return
	}
	if time.Since(m.started) >= quietFor {
		fmt.Fprintf(m.w, "\r%-*s", m.width, text)
		m.width = len(text)
	}
}

// done takes the line off the terminal.
func (m *meter) done() {
	if m.live && m.width > 0 {
		fmt.Fprintf(m.w, "\r%*s\r", m.width, "")
		m.width = 0
	}
}

// eventText writes one event on one line; an idle stream says nothing.
func eventText(e *towpathv1.WatchJobResponse) string {
	switch e := e.GetEvent().(type) {
	case *towpathv1.WatchJobResponse_Job:
		text := fmt.Sprintf("job %s %s", e.Job.GetId(), stateWord(e.Job.GetState()))
		switch {
		case e.Job.GetFault() != nil:
			text += ": " + e.Job.GetFault().GetMessage()
		case e.Job.GetState() == towpathv1.JobState_JOB_STATE_ANSWERED:
			text += fmt.Sprintf(": %s, %s", outcomeWord(e.Job.GetOutcome()), verdictWord(e.Job.GetVerdict()))
		case e.Job.GetWaitingReason() != "":
			text += ": " + e.Job.GetWaitingReason()
		case e.Job.GetRoute() != nil:
			text += ": " + e.Job.GetRoute().GetSheet()
		}
		return text
	case *towpathv1.WatchJobResponse_Progress:
		p := e.Progress
		return fmt.Sprintf("iteration %3d  primal % .8e  dual % .8e  gap %.1e  residuals %.1e %.1e  step %.2f  %s",
			p.GetIteration(), p.GetPrimal(), p.GetDual(), p.GetGap(), p.GetPrimalResidual(), p.GetDualResidual(),
			p.GetStep(), durationText(p.GetElapsed()))
	}
	return ""
}
