package wire

import (
	"errors"
	"runtime"
	"slices"
	"testing"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

// small is a valid model to break: a complex vector z of 2, a Hermitian matrix H of order 2, one constraint in terms and
// one in compressed rows.
func small() *towpathv1.Model {
	return &towpathv1.Model{
		Blocks: []*towpathv1.Block{
			{Name: "z", Field: towpathv1.Field_FIELD_COMPLEX, Rows: 2},
			{Name: "H", Field: towpathv1.Field_FIELD_HERMITIAN, Rows: 2},
		},
		Objective: &towpathv1.Objective{Terms: []*towpathv1.Term{{Of: &towpathv1.Term_Block{Block: "z"}, Re: 1}}},
		Constraints: []*towpathv1.Constraint{
			{Name: "few", Field: towpathv1.Field_FIELD_HERMITIAN, Rows: 2, Cone: towpathv1.Cone_CONE_PSD, Terms: []*towpathv1.Term{
				{Row: []uint64{1, 0}, Of: &towpathv1.Term_Block{Block: "z"}, Entry: []uint64{1}, Re: 1},
			}},
			{Field: towpathv1.Field_FIELD_COMPLEX, Rows: 1, Cone: towpathv1.Cone_CONE_ZERO, Coefficients: &towpathv1.CompressedRows{
				Starts: arrayOf(make([]byte, 16)), Columns: arrayOf(nil), C128: arrayOf(nil)}},
		},
	}
}

// Every way to break a message, with the exact words that come back.
func TestFaultsNamePlaceAndCure(t *testing.T) {
	if _, err := ModelFromProto(small()); err != nil {
		t.Fatalf("the model to break is broken: %v", err)
	}
	upload := &towpathv1.Array{Place: &towpathv1.Array_Upload{Upload: &towpathv1.Upload{Id: 1, SizeBytes: 16}}}
	for _, c := range []struct {
		change     func(*towpathv1.Model)
		path, says string
	}{
		{func(m *towpathv1.Model) { m.Blocks[0].Field = 0 }, "blocks[0].field",
			"block 0 'z': its field is missing or unknown; use FIELD_REAL, FIELD_COMPLEX, FIELD_SYMMETRIC or FIELD_HERMITIAN"},
		{func(m *towpathv1.Model) { m.Blocks[0].Field = 99 }, "blocks[0].field",
			"block 0 'z': its field is missing or unknown; use FIELD_REAL, FIELD_COMPLEX, FIELD_SYMMETRIC or FIELD_HERMITIAN"},
		{func(m *towpathv1.Model) { m.Blocks[1].Cone = 42 }, "blocks[1].cone",
			"block 1 'H': its cone is missing or unknown; use one of CONE_ZERO, CONE_NONNEG, CONE_RANGE, CONE_LORENTZ, CONE_ROTATED_LORENTZ, CONE_PSD (and CONE_FREE for blocks)"},
		{func(m *towpathv1.Model) { m.Blocks[0].Rows = 0 }, "blocks[0].rows", "block 0 'z': it has no rows; give its length, or its order for a matrix"},
		{func(m *towpathv1.Model) { m.Blocks[0].Rows = 1 << 40 }, "blocks[0].rows", "block 0 'z': the size 1099511627776 is more than 4294967295; split the model"},
		{func(m *towpathv1.Model) { m.Blocks[0].Cols = 1 << 63 }, "blocks[0].cols", "block 0 'z': the size 9223372036854775808 is more than 4294967295; split the model"},
		{func(m *towpathv1.Model) { m.Blocks[0].Rows, m.Blocks[0].Cols = 1<<31, 3 }, "blocks[0].rows",
			"block 0 'z': with 2147483648 x 3 entries the model has more than 4294967295; split the model"},
		{func(m *towpathv1.Model) { m.Blocks[1].Rows = 92682 }, "blocks[1].rows", "block 1 'H': with 92682 x 92682 entries the model has more than 4294967295; split the model"},
		{func(m *towpathv1.Model) { m.Blocks[0].Lower = &towpathv1.Numbers{Re: []float64{1, 2, 3}} }, "blocks[0].lower",
			"block 0 'z': there are 3 limits for 2 numbers; give one for each, or one for all"},
		{func(m *towpathv1.Model) {
			m.Blocks[0].Upper = &towpathv1.Numbers{Re: []float64{1, 2}, Im: []float64{3}}
		}, "blocks[0].upper", "block 0 'z': there are 2 real and 1 imaginary parts; give as many of both, or no imaginary parts"},
		{func(m *towpathv1.Model) {
			m.Blocks[0].Upper = &towpathv1.Numbers{Re: []float64{1}, F64: arrayOf(make([]byte, 8))}
		}, "blocks[0].upper", "block 0 'z': numbers are given in more than one form; use re (and im), or f64, or c128"},
		{func(m *towpathv1.Model) {
			m.Blocks[0].Upper = &towpathv1.Numbers{F64: arrayOf(nil), C128: arrayOf(nil)}
		}, "blocks[0].upper", "block 0 'z': numbers are given in more than one form; use re (and im), or f64, or c128"},
		{func(m *towpathv1.Model) { m.Blocks[0].Upper = &towpathv1.Numbers{F64: arrayOf(make([]byte, 12))} }, "blocks[0].upper.f64",
			"block 0 'z': an array has 12 bytes, which is no multiple of 8; send 8 bytes per number, little-endian"},
		{func(m *towpathv1.Model) { m.Blocks[0].Upper = &towpathv1.Numbers{C128: arrayOf(make([]byte, 24))} }, "blocks[0].upper.c128",
			"block 0 'z': an array has 24 bytes, which is no multiple of 16; send 16 bytes per number, little-endian"},
		{func(m *towpathv1.Model) { m.Blocks[0].Upper = &towpathv1.Numbers{C128: upload} }, "blocks[0].upper.c128",
			"block 0 'z': an array is announced as an upload, but this message has no chunks; send the model with UploadModel, or put the bytes into data"},
		{func(m *towpathv1.Model) {
			m.Blocks[0].Rows, m.Blocks[0].Lower = 1<<26, &towpathv1.Numbers{Re: []float64{0}}
		}, "blocks[0].lower", "block 0 'z': one limit is given for 67108864 numbers; give limits one by one where there are very many"},
		{func(m *towpathv1.Model) { m.Objective.Sense = 9 }, "objective.sense", "the objective: its sense is unknown; use SENSE_MINIMIZE or SENSE_MAXIMIZE"},
		{func(m *towpathv1.Model) { m.Objective.Coefficients = m.Constraints[1].Coefficients }, "objective",
			"the objective: it has terms and compressed coefficients; give one of the two"},
		{func(m *towpathv1.Model) {
			m.Objective = &towpathv1.Objective{Coefficients: &towpathv1.CompressedRows{
				Starts: arrayOf(bytesIn([]int{0, 2}, false, encodeStart)), Columns: arrayOf(make([]byte, 4)), F64: arrayOf(make([]byte, 8))}}
		}, "objective.coefficients", "the objective: it has 1 columns, 1 values and a row from 0 to 2; give one value per column, in one row"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Of = &towpathv1.Term_Block{Block: "q"} }, "objective.terms[0].block",
			"the objective: there is no block 'q'; use the name of a block, or block_number"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Of = &towpathv1.Term_Block{} }, "objective.terms[0].block",
			"the objective: there is no block ''; use the name of a block, or block_number"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Of = nil }, "objective.terms[0].block",
			"the objective: a coefficient names no block; give block or block_number"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Of = &towpathv1.Term_BlockNumber{BlockNumber: 2} }, "objective.terms[0].block_number",
			"the objective: there is no block 2, there are 2; count blocks from 0"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Row = []uint64{1} }, "objective.terms[0].row", "the objective: row 1 does not exist, there are 1; count rows from 0"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Entry = []uint64{2} }, "objective.terms[0].entry",
			"the objective: entry 2 of block 0 'z' does not exist, there are 2; count entries from 0"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Entry = []uint64{0, 1} }, "objective.terms[0].entry",
			"the objective: entry (0, 1) of block 0 'z' does not exist, its shape is 2 x 1; count rows and columns from 0"},
		{func(m *towpathv1.Model) { m.Objective.Terms[0].Entry = []uint64{0, 0, 0} }, "objective.terms[0].entry",
			"the objective: the place of an entry has 3 numbers; give one number, or row and column"},
		{func(m *towpathv1.Model) { m.Constraints[0].Cone = 0 }, "constraints[0].cone",
			"constraint 0 'few': its cone is missing or unknown; use one of CONE_ZERO, CONE_NONNEG, CONE_RANGE, CONE_LORENTZ, CONE_ROTATED_LORENTZ, CONE_PSD (and CONE_FREE for blocks)"},
		{func(m *towpathv1.Model) { m.Constraints[0].Rows = 0 }, "constraints[0].rows", "constraint 0 'few': it has no rows; leave it out, or give its number of rows (its order for a matrix)"},
		{func(m *towpathv1.Model) { m.Constraints[0].Rows = 92682 }, "constraints[0].rows", "constraint 0 'few': order 92682 is larger than 92681; split the constraint"},
		{func(m *towpathv1.Model) { m.Constraints[0].Rows = 92681 }, "constraints[0].rows",
			"constraint 0 'few': 4294930221 rows have only 1 terms; send large maps as compressed coefficients"},
		{func(m *towpathv1.Model) { m.Constraints[0].Terms[0].Row = []uint64{0, 1} }, "constraints[0].terms[0].row",
			"constraint 0 'few': row (0, 1) is above the diagonal; give the lower triangle only; the upper one follows from it"},
		{func(m *towpathv1.Model) { m.Constraints[0].Terms[0].Row = []uint64{2, 0} }, "constraints[0].terms[0].row",
			"constraint 0 'few': row (2, 0) does not exist, the order is 2; count rows and columns from 0"},
		{func(m *towpathv1.Model) { m.Constraints[0].Terms[0].Row = []uint64{1} }, "constraints[0].terms[0].row",
			"constraint 0 'few': the place of a row in a matrix has 1 numbers; give its row and its column"},
		{func(m *towpathv1.Model) { m.Constraints[0].Lower = &towpathv1.Numbers{} }, "constraints[0].lower",
			"constraint 0 'few': it has limits but its cone is not CONE_RANGE; leave them out, or use CONE_RANGE"},
		{func(m *towpathv1.Model) { m.Constraints[1].Terms = m.Objective.Terms }, "constraints[1]",
			"constraint 1: it has terms and compressed coefficients; give one of the two"},
		{func(m *towpathv1.Model) {
			m.Constraints[1].Coefficients, m.Constraints[1].ConjugateCoefficients = nil, m.Constraints[1].Coefficients
		}, "constraints[1].coefficients", "constraint 1: it has coefficients on conjugates and none on entries; give coefficients, with all row starts 0 when there are none"},
		{func(m *towpathv1.Model) { m.Constraints[1].Coefficients.Starts = arrayOf(make([]byte, 24)) }, "constraints[1].coefficients.starts",
			"constraint 1: there are 3 row starts for 1 rows; give one more than rows"},
		{func(m *towpathv1.Model) { m.Constraints[1].Coefficients.Columns = arrayOf(make([]byte, 6)) }, "constraints[1].coefficients.columns",
			"constraint 1: an array has 6 bytes, which is no multiple of 4; send 4 bytes per number, little-endian"},
		{func(m *towpathv1.Model) { m.Constraints[1].Coefficients.F64 = arrayOf(nil) }, "constraints[1].coefficients",
			"constraint 1: there are real and complex values; give f64 or c128"},
		{func(m *towpathv1.Model) { m.Constraints[1].Coefficients.C128 = upload }, "constraints[1].coefficients.c128",
			"constraint 1: an array is announced as an upload, but this message has no chunks; send the model with UploadModel, or put the bytes into data"},
		{func(m *towpathv1.Model) { m.Constraints[1].Constant = &towpathv1.Numbers{Im: []float64{1}} }, "constraints[1].constant",
			"constraint 1: there are 0 real and 1 imaginary parts; give as many of both, or no imaginary parts"},
	} {
		m := small()
		c.change(m)
		_, err := ModelFromProto(m)
		var faults *model.FaultError
		if !errors.As(err, &faults) || len(faults.Faults) != 1 {
			t.Errorf("error %v, want a fault: %s", err, c.says)
			continue
		}
		if f := faults.Faults[0]; f.Path != c.path || f.String() != c.says {
			t.Errorf("got\n %s: %s\nwant\n %s: %s", f.Path, f, c.path, c.says)
		}
	}
	if _, err := ModelFromProto(nil); err == nil || err.(*model.FaultError).Faults[0].String() != "the request: it has no model; give a model, or the name of an uploaded one" {
		t.Errorf("no model: %v", err)
	}
}

// What passes decoding and only the model itself can judge: the two together refuse with the model's words.
func TestFaultsLeftToTheModel(t *testing.T) {
	for _, c := range []struct {
		change func(*towpathv1.Model)
		says   string
	}{
		{func(m *towpathv1.Model) { m.Blocks[1].Name = "z" }, "block 1 'z': block 0 has the same name; give every block its own name, or none"},
		{func(m *towpathv1.Model) { m.Blocks[1].Cols = 3 }, "block 1 'H': a hermitian matrix of shape 2 x 3 is not square; give the order as rows and columns"},
		{func(m *towpathv1.Model) {
			m.Constraints[1].Coefficients.Starts = arrayOf(bytesIn([]int{0, -5}, false, encodeStart))
		}, "constraint 1: its row starts run from 0 to -5 for 0 coefficients; begin with 0 and end with the number of coefficients"},
		{func(m *towpathv1.Model) { m.Constraints[1].Constant = &towpathv1.Numbers{Re: []float64{1, 2}} }, "constraint 1: it has 2 constants for 1 rows; give one per row, or none"},
	} {
		p := small()
		c.change(p)
		m, err := ModelFromProto(p)
		if err != nil {
			t.Errorf("decoding: %v", err)
			continue
		}
		err = m.Validate()
		var faults *model.FaultError
		if !errors.As(err, &faults) || !slices.ContainsFunc(faults.Faults, func(f model.Fault) bool { return f.String() == c.says }) {
			t.Errorf("got %v, want %s", err, c.says)
		}
	}
}

// A small message cannot ask for much memory, however often it asks for what is allowed once.
func TestSmallMessagesStaySmall(t *testing.T) {
	if testing.Short() {
		t.Skip("takes all the memory that is allowed")
	}
	bounded := &towpathv1.Model{}
	for range 2000 {
		bounded.Blocks = append(bounded.Blocks, &towpathv1.Block{Field: towpathv1.Field_FIELD_REAL, Rows: 1 << 20, Lower: &towpathv1.Numbers{Re: []float64{0}}})
	}
	rows := &towpathv1.Model{Blocks: []*towpathv1.Block{{Field: towpathv1.Field_FIELD_REAL, Rows: 1}}}
	for range 2000 {
		rows.Constraints = append(rows.Constraints, &towpathv1.Constraint{Field: towpathv1.Field_FIELD_REAL, Rows: 1 << 20, Cone: towpathv1.Cone_CONE_ZERO})
	}
	const most = 2 * 16 * spareNumbers // a complex number each, and as much for what is thrown away
	for _, p := range []*towpathv1.Model{bounded, rows} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, err := ModelFromProto(p)
		runtime.ReadMemStats(&after)
		if err == nil {
			t.Error("accepted")
		}
		if took := after.TotalAlloc - before.TotalAlloc; took > most {
			t.Errorf("took %d bytes, allowed %d", took, most)
		}
	}
}
