package main

import (
	"bytes"
	"flag"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"towpath/broker/wire"
	"towpath/model"
	"towpath/model/exchange"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/encoding/protojson"
	"google.golang.org/protobuf/proto"
)

const fileHelp = `FILE is a model in one of these formats, told by its name's ending; - reads standard input.
  json    Model of towpath.v1 as protobuf JSON        .json
  binary  Model of towpath.v1 as protobuf             .pb .binpb
  sdpa    semidefinite program, SDPA sparse format    .dat-s
  mps     linear program, free MPS format             .mps`

// format is one way of writing a model in a file.
type format struct {
	name    string
	endings []string
	parse   func([]byte) (*towpathv1.Model, error)
}

func formats() []format {
	return []format{
		{"json", []string{".json"}, parseJSON},
		{"binary", []string{".pb", ".binpb"}, parseBinary},
		{"sdpa", []string{".dat-s"}, foreign(exchange.ReadSDPA)},
		{"mps", []string{".mps"}, foreign(exchange.ReadMPS)},
	}
}

// fileFlags say how a model file is to be read.
type fileFlags struct{ format string }

func (f *fileFlags) declare(flags *flag.FlagSet) {
	flags.StringVar(&f.format, "format", "", "the file's `format`, whatever its name: json, binary, sdpa or mps")
}

// read returns the model of the one file that the operands name.
func (f *fileFlags) read(operands []string, stdin io.Reader) (*towpathv1.Model, error) {
	if len(operands) != 1 {
		return nil, usageError("give one model file, or - for standard input; %d were given", len(operands))
	}
	name := operands[0]
	var data []byte
	var err error
	if name == "-" {
		name = "standard input"
		data, err = io.ReadAll(stdin)
	} else {
		data, err = os.ReadFile(name)
	}
	if err != nil {
		return nil, usageError("%v", err)
	}
	chosen, err := f.choose(name, data)
	if err != nil {
		return nil, err
	}
	m, err := chosen.parse(data)
	if err != nil {
		return nil, usageError("%s, read as %s: %v", name, chosen.name, err)
	}
	if m.GetName() == "" {
		m.Name = strings.TrimSuffix(filepath.Base(name), filepath.Ext(name))
	}
	return m, nil
}

func (f *fileFlags) choose(name string, data []byte) (format, error) {
	for _, known := range formats() {
		if f.format == known.name {
			return known, nil
		}
		for _, ending := range known.endings {
			if f.format == "" && strings.HasSuffix(strings.ToLower(name), ending) {
				return known, nil
			}
		}
	}
	if f.format != "" {
		return format{}, usageError("--format %s: there are json, binary, sdpa and mps", f.format)
	}
	// Of the four only JSON begins with a brace.
	if bytes.HasPrefix(bytes.TrimLeft(data, " \t\r\n"), []byte("{")) {
		return formats()[0], nil
	}
	return format{}, usageError("%s: its name does not tell the format; say --format json, binary, sdpa or mps", name)
}

func parseJSON(data []byte) (*towpathv1.Model, error) {
	m := new(towpathv1.Model)
	if err := protojson.Unmarshal(data, m); err != nil {
		return nil, protoError(err)
	}
	return m, nil
}

func parseBinary(data []byte) (*towpathv1.Model, error) {
	m := new(towpathv1.Model)
	if err := proto.Unmarshal(data, m); err != nil {
		return nil, protoError(err)
	}
	return m, nil
}

// protoError takes the library's own name off its messages. It writes ordinary and no-break spaces in turn.
func protoError(err error) error {
	text := strings.ReplaceAll(err.Error(), "\u00a0", " ")
	return fmt.Errorf("%s", strings.TrimPrefix(text, "proto: "))
}

// foreign reads a format of the trade.
func foreign(read func(io.Reader) (*model.Model, error)) func([]byte) (*towpathv1.Model, error) {
	return func(data []byte) (*towpathv1.Model, error) {
		m, err := read(bytes.NewReader(data))
		if err != nil {
			return nil, err
		}
		return wire.ModelToProto(m), nil
	}
}
