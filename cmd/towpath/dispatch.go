package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"text/tabwriter"
)

// streams are the three standard ones; live says that people watch err as it is written.
type streams struct {
	in       io.Reader
	out, err io.Writer
	live     bool
}

// command is one word after towpath.
type command struct {
	name     string
	operands string // as shown in help
	summary  string
	detail   string
	// prepare declares the command's options and returns what to do with the operands once they are parsed.
	prepare func(*flag.FlagSet) action
}

// action does the work of a command. Its error decides the exit code.
type action func(ctx context.Context, operands []string, io streams) error

// commands lists what towpath can do, in the order of help.
func commands() []command {
	return []command{
		demoCommand(),
		solveCommand(),
		routesCommand(),
		backendsCommand(),
		jobsCommand(),
		watchCommand(),
		fetchCommand(),
		withdrawCommand(),
	}
}

// run is main without the process: it parses the arguments, runs one command and returns the exit code.
func run(ctx context.Context, args []string, io streams) int {
	err := dispatch(ctx, args, io)
	if err == nil {
		return exitAnswered
	}
	code := exitCode(err)
	if text := explain(err); text != "" {
		fmt.Fprintf(io.err, "towpath: %s\n", text)
	}
	return code
}

func dispatch(ctx context.Context, args []string, io streams) error {
	if len(args) == 0 {
		writeOverview(io.err)
		return usageError("no command given; towpath demo is a good first one")
	}
	name, rest := args[0], args[1:]
	switch name {
	case "help", "-h", "-help", "--help":
		return help(rest, io)
	}
	c, err := find(name)
	if err != nil {
		return err
	}
	flags, act := c.flagSet()
	operands, err := parse(flags, rest)
	if errors.Is(err, flag.ErrHelp) {
		writeHelp(io.out, c)
		return nil
	}
	if err != nil {
		return usageError("%s: %v; towpath help %s lists the options", c.name, err, c.name)
	}
	return act(ctx, operands, io)
}

func find(name string) (command, error) {
	for _, c := range commands() {
		if c.name == name {
			return c, nil
		}
	}
	return command{}, usageError("there is no command %q; towpath help lists them", name)
}

func (c command) flagSet() (*flag.FlagSet, action) {
	flags := flag.NewFlagSet(c.name, flag.ContinueOnError)
	flags.SetOutput(io.Discard)
	flags.Usage = func() {}
	return flags, c.prepare(flags)
}

// parse lets options stand before, between and after operands. After "--" everything is an operand.
func parse(flags *flag.FlagSet, args []string) (operands []string, err error) {
	for {
		if err := flags.Parse(args); err != nil {
			return nil, err
		}
		rest := flags.Args()
		if consumed := len(args) - len(rest); consumed > 0 && args[consumed-1] == "--" {
			return append(operands, rest...), nil
		}
		if len(rest) == 0 {
			return operands, nil
		}
		operands, args = append(operands, rest[0]), rest[1:]
	}
}

func help(args []string, io streams) error {
	if len(args) == 0 {
		writeOverview(io.out)
		return nil
	}
	c, err := find(args[0])
	if err != nil {
		return err
	}
	writeHelp(io.out, c)
	return nil
}

func writeOverview(w io.Writer) {
	fmt.Fprint(w, "towpath sends optimization models, complex ones included, to a broker that finds a route to a solver,\n"+
		"carries the answer back and examines it.\n\n")
	table := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	for _, c := range commands() {
		fmt.Fprintf(table, "  towpath %s %s\t%s\n", c.name, c.operands, c.summary)
	}
	fmt.Fprint(table, "  towpath help COMMAND\tits options\n")
	table.Flush()
	fmt.Fprintf(w, "\nWithout --address, demo, solve, routes and backends run a broker inside this process.\n\n%s", exitCodes)
}

func writeHelp(w io.Writer, c command) {
	flags, _ := c.flagSet()
	fmt.Fprintf(w, "towpath %s %s\n    %s\n", c.name, c.operands, c.summary)
	if c.detail != "" {
		fmt.Fprintf(w, "\n%s\n", c.detail)
	}
	fmt.Fprint(w, "\nOptions\n")
	table := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	flags.VisitAll(func(f *flag.Flag) {
		kind, usage := flag.UnquoteUsage(f)
		fmt.Fprintf(table, "  --%s %s\t%s\n", f.Name, kind, usage)
	})
	table.Flush()
	fmt.Fprintf(w, "\n%s", exitCodes)
}
