package wire

import (
	"towpath/model/check"
	towpathv1 "towpath/proto/towpath/v1"
)

// ExaminationToProto encodes the examiner's report.
func ExaminationToProto(r *check.Report) *towpathv1.Examination {
	p := &towpathv1.Examination{
		Verdict: VerdictToProto(r.Verdict), Reasons: r.Reasons,
		Objective: known(r.Objective), Bound: known(r.Bound), RelativeGap: known(r.RelativeGap),
		PrimalResidual: known(r.Primal), DualResidual: known(r.Dual), Complementarity: known(r.Complementarity), Price: known(r.Price),
		CertificateResidual: known(r.CertificateResidue), CertificateSize: known(r.CertificateSize), CertificateRadius: known(r.CertificateRadius()),
	}
	for _, c := range r.Constraints {
		p.Constraints = append(p.Constraints, &towpathv1.ConstraintResiduals{
			Number: uint32(c.Number), Name: c.Name, Distance: c.Distance,
			SmallestEigenvalue: known(c.SmallestEigenvalue), MultiplierDistance: known(c.MultiplierDistance), Complementarity: known(c.Complementarity),
		})
	}
	for _, b := range r.Blocks {
		p.Blocks = append(p.Blocks, &towpathv1.BlockResiduals{
			Number: uint32(b.Number), Name: b.Name, Distance: b.Distance, BoundViolation: b.BoundViolation,
			SmallestEigenvalue: known(b.SmallestEigenvalue), Stationarity: known(b.Stationarity),
		})
	}
	return p
}

// VerdictToProto encodes a verdict.
func VerdictToProto(v check.Verdict) towpathv1.Verdict { return towpathv1.Verdict(v) }
