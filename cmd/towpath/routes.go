package main

import (
	"context"
	"flag"
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"towpath/capability"
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
			all := f.Bool("all", false, "show every sheet's route in full, not only the one that would be taken")
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
				b, err := connect(*address)
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
					writePlan(io.out, plan, name, *all)
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

// writePlan shows first what the model asks for, then one line per sheet, then the chosen route in full, or all.
func writePlan(w io.Writer, plan *towpathv1.PlanRoutesResponse, name string, all bool) {
	if name != "" {
		fmt.Fprintf(w, "model  %s\n\n", name)
	}
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "the model asks for\tcoefficients")
	for _, d := range plan.GetDemands() {
		fmt.Fprintf(t, "  %s\t%d\n", demandText(d), d.GetNonzeros())
	}
	fmt.Fprintln(t)
	t.Flush()
	fmt.Fprintln(t, "\tsheet\tpredicted\tmemory\troute\twhy")
	for _, p := range plan.GetProposals() {
		mark := ""
		if p.GetChosen() {
			mark = "*"
		}
		seconds, bytes, way := "-", "-", "none"
		if r := p.GetRoute(); r != nil {
			seconds, bytes, way = secondsText(r.GetToll().GetSeconds()), capability.BytesText(r.GetToll().GetBytes()), routeText(r)
		}
		fmt.Fprintf(t, "%s\t%s\t%s\t%s\t%s\t%s\n", mark, p.GetSheet(), seconds, bytes, way, p.GetReason())
	}
	t.Flush()
	for _, p := range plan.GetProposals() {
		if all || p.GetChosen() || p.GetRoute() == nil {
			fmt.Fprintf(w, "\n%s\n", strings.TrimRight(p.GetText(), "\n"))
		}
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
				b, err := connect(*address)
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
