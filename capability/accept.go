package capability

import (
	"cmp"
	"fmt"
	"maps"
	"slices"

	"towpath/model"
)

// Accepts reports, as an error, the first thing in the model that the sheet does not take natively.
func (s *Sheet) Accepts(m *model.Model) error {
	for _, d := range Summarize(m) {
		limit, ok := s.Takes[d.Kind]
		if !ok {
			return fmt.Errorf("sheet %s does not take %s", s.Name, d.Kind)
		}
		if limit > 0 && d.Size > limit {
			return fmt.Errorf("sheet %s takes %s up to size %d, the model has size %d", s.Name, d.Kind, limit, d.Size)
		}
	}
	return nil
}

// Kinds lists what the sheet takes natively, sorted by name.
func (s *Sheet) Kinds() []Kind {
	return slices.SortedFunc(maps.Keys(s.Takes), func(a, b Kind) int { return cmp.Compare(a.String(), b.String()) })
}
