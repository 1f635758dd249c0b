package main

import (
	"context"
	"flag"
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	towpathv1 "towpath/proto/towpath/v1"
)

func routesCommand() command {
	return command{
		name: "routes", operands: "FILE", summary: "show the best route to every back end, or why there is none, without solving",
		detail: fileHelp,
		prepare: func(f *flag.FlagSet) action {
			var job jobFlags
			var source fileFlags
			address := f.String("address", "", addressUsage)
			asJSON := f.Bool("json", false, "write the proposals as protobuf JSON and nothing else")
			job.declare(f)
			source.declare(f)
			return func(ctx context.Context, operands []string, io streams) error {
				options, err := job.options()
				if err != nil {
					return err
				}
				m, err := source.read(operands, io.in)
				if err != nil {
					return err
				}
				b, err := connect(*address, io)
				if err != nil {
					return err
				}
				defer b.close()
				name := m.GetName()
				plan, err := b.plan(ctx, m, options)
				if err != nil {
					return err
				}
				if *asJSON {
					err = writeJSON(io, plan)
				} else {
					writePlan(io.out, plan, name)
				}
				if err == nil && !anyRoute(plan) {
					return quiet(exitUnanswered)
				}
				return err
			}
		},
	}
}

func anyRoute(plan *towpathv1.PlanRoutesResponse) bool {
	for _, p := range plan.GetProposals() {
		if p.GetRoute() != nil {
			return true
		}
	}
	return false
}

// writePlan shows first what the model asks for, then one line per sheet, then every proposal in full.
func writePlan(w io.Writer, plan *towpathv1.PlanRoutesResponse, name string) {
	if name != "" {
		fmt.Fprintf(w, "model  %s\n\n", name)
	}
	fmt.Fprintln(w, "the model asks for")
	for _, d := range plan.GetDemands() {
		fmt.Fprintf(w, "  %s, %d coefficients\n", demandText(d), d.GetNonzeros())
	}
	fmt.Fprintln(w)
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "\tsheet\tpredicted\tmemory\tbridges\twhy")
	for _, p := range plan.GetProposals() {
		mark := ""
		if p.GetChosen() {
			mark = "*"
		}
		seconds, bytes, bridges := "-", "-", "no route"
		if r := p.GetRoute(); r != nil {
			seconds, bytes = secondsText(r.GetToll().GetSeconds()), bytesText(r.GetToll().GetBytes())
			bridges = fmt.Sprint(len(bridgeNames(r)))
			if r.GetNative() {
				bridges = "native"
			}
		}
		fmt.Fprintf(t, "%s\t%s\t%s\t%s\t%s\t%s\n", mark, p.GetSheet(), seconds, bytes, bridges, p.GetReason())
	}
	t.Flush()
	for _, p := range plan.GetProposals() {
		fmt.Fprintln(w)
		switch {
		case p.GetText() != "":
			fmt.Fprintf(w, "%s\n", strings.TrimRight(p.GetText(), "\n"))
		case p.GetRoute() != nil:
			writeRoute(w, p.GetRoute())
		default:
			writeUnreachable(w, p)
		}
	}
}

func writeUnreachable(w io.Writer, p *towpathv1.Proposal) {
	fmt.Fprintf(w, "no route to %s\n", p.GetSheet())
	for _, reason := range p.GetUnreachable().GetReasons() {
		fmt.Fprintf(w, "  %s\n", reason)
	}
}

func backendsCommand() command {
	return command{
		name: "backends", summary: "list the registered back ends, their sheets and what these take natively",
		prepare: func(f *flag.FlagSet) action {
			address := f.String("address", "", addressUsage)
			asJSON := f.Bool("json", false, "write the list as protobuf JSON and nothing else")
			return func(ctx context.Context, operands []string, io streams) error {
				if err := none(operands); err != nil {
					return err
				}
				b, err := connect(*address, io)
				if err != nil {
					return err
				}
				defer b.close()
				all, err := b.routes.ListBackends(ctx, &towpathv1.ListBackendsRequest{})
				if err != nil {
					return err
				}
				if *asJSON {
					return writeJSON(io, all)
				}
				writeBackends(io.out, all)
				return nil
			}
		},
	}
}

func writeBackends(w io.Writer, all *towpathv1.ListBackendsResponse) {
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "back end\tversion\tsheet\taccuracy\treturns")
	for _, b := range all.GetBackends() {
		if !b.GetAvailable() {
			fmt.Fprintf(t, "%s\t-\t-\t-\tabsent: %s\n", b.GetName(), b.GetUnavailableReason())
			continue
		}
		for _, s := range b.GetSheets() {
			returns := []string{"values"}
			for _, r := range []struct {
				yes  bool
				name string
			}{
				{s.GetReturnsMultipliers(), "multipliers"},
				{s.GetReturnsInfeasibilityCertificates(), "certificates of infeasibility"},
				{s.GetReturnsUnboundednessCertificates(), "of unboundedness"},
			} {
				if r.yes {
					returns = append(returns, r.name)
				}
			}
			fmt.Fprintf(t, "%s\t%s\t%s\t%.0e\t%s\n", b.GetName(), b.GetVersion(), s.GetName(), s.GetAccuracy(), strings.Join(returns, ", "))
		}
	}
	t.Flush()
	for _, b := range all.GetBackends() {
		for _, s := range b.GetSheets() {
			fmt.Fprintf(w, "\n%s takes natively\n", s.GetName())
			for _, k := range s.GetTakes() {
				limit := ""
				if k.GetLargestSize() > 0 {
					limit = fmt.Sprintf("  up to size %d", k.GetLargestSize())
				}
				fmt.Fprintf(w, "  %s%s\n", k.GetKind(), limit)
			}
		}
	}
}
