package model

import (
	"fmt"
	"unicode"
	"unicode/utf8"
)

// MaxName is the longest name in bytes.
const MaxName = 256

// Title names a block or a constraint for people, by its number alone where its name could not be shown.
func Title(what string, k int, name string) string {
	if problem, _ := wrongName(name); problem != "" || name == "" {
		return fmt.Sprintf("%s %d", what, k)
	}
	return fmt.Sprintf("%s %d '%s'", what, k, name)
}

// unique checks the name of block or constraint number k against those seen before it.
func (v *validator) unique(path, place, what, name string, k int, seen map[string]int) {
	if name == "" || !v.name(path+".name", place, name) {
		return
	}
	if first, ok := seen[name]; ok {
		v.fault(path+".name", place, fmt.Sprintf("%s %d has the same name", what, first), "give every "+what+" its own name, or none")
		return
	}
	seen[name] = k
}

func (v *validator) name(path, place, name string) bool {
	problem, cure := wrongName(name)
	if problem != "" {
		v.fault(path, place, problem, cure)
	}
	return problem == ""
}

// wrongName says what is wrong with a name, or nothing.
func wrongName(name string) (problem, cure string) {
	if len(name) > MaxName {
		return fmt.Sprintf("its name has %d bytes", len(name)), fmt.Sprintf("use at most %d", MaxName)
	}
	if !utf8.ValidString(name) {
		return "its name is not UTF-8", "send UTF-8"
	}
	for _, r := range name {
		if unicode.IsControl(r) {
			return fmt.Sprintf("its name has the control character %U", r), "use printable characters"
		}
	}
	return "", ""
}
