package archipelago

import (
	"fmt"
	"math"
	"math/cmplx"

	"towpath/model"
	"towpath/model/internal/rows"
)

const (
	letters     = 4   // phases of a pulse, a quarter turn apart
	meanPhotons = 0.6 // per pulse
)

// pulses asks for the measurement that tells best which of four phases a faint pulse of light has.
//
// The states are |psi_k> = sum_j c_j exp(2 pi i j k / 4) |j>: four phases of a coherent state span four dimensions, j
// counting photons modulo four. All are equally likely. One Hermitian block per verdict of the detector, together the
// identity:
//
//	maximize (1/4) sum_k <psi_k| E_k |psi_k>   subject to   I - sum_k E_k = 0,  E_k positive semidefinite
//
// For states that a unitary carries into one another the square-root measurement is optimal: M. Ban, K. Kurokawa,
// R. Momose, O. Hirota, "Optimum measurements for discrimination among symmetric quantum states and parameter
// estimation", International Journal of Theoretical Physics 36, 1997 (from memory). It succeeds with probability
// (sum_j c_j)^2 / 4, and the multiplier of the equality, the operator of Holevo's and Yuen's optimality conditions, is
// (sum_j c_j) / 4 * diag(c). The laboratory sees all of it through an interferometer, a unitary change of basis.
func pulses() Case {
	m := &model.Model{Name: "Which of four phases has a faint pulse?", Objective: model.Objective{Sense: model.Maximize}}
	c, basis := photonAmplitudes(), interferometer()
	size := model.PackedLen(letters)
	complete := rows.New(model.Hermitian, size)
	sum, root := 0.0, newSquare(letters)
	for j, amplitude := range c {
		sum += amplitude
		root[j][j] = complex(amplitude, 0)
	}
	for i := range letters {
		complete.Const(model.PackedIndex(letters, i, i), 1)
	}
	for k := range letters {
		psi := make([]complex128, letters)
		for j, amplitude := range c {
			psi[j] = cmplx.Rect(amplitude, 2*math.Pi*float64(j*k)/letters)
		}
		psi = basis.times(psi)
		m.Blocks = append(m.Blocks, model.Block{
			Name: fmt.Sprintf("verdict of phase %d", 360/letters*k), Field: model.Hermitian, Rows: letters, Cols: letters, Cone: model.PSD,
		})
		for e := range size {
			i, j := model.PackedAt(letters, e)
			// <rho, E> = Re sum conj(rho_ij) E_ij; a packed entry off the diagonal stands for two.
			coef := cmplx.Conj(psi[i]*cmplx.Conj(psi[j])) / letters
			if i == j {
				coef = complex(real(coef), 0)
			} else {
				coef *= 2
			}
			m.Objective.Col = append(m.Objective.Col, uint32(k*size+e))
			m.Objective.Coef = append(m.Objective.Coef, coef)
			complete.Add(e, k*size+e, -1)
		}
	}
	m.Constraints = []model.Constraint{complete.In(model.Zero, "the verdicts are complete")}
	return Case{
		ID:    "pulses",
		Story: "The laboratory designs the detector that best tells which of four phases a faint pulse from the observatory has.",
		Model: m,
		Known: &Known{
			Source:      "square-root measurement of symmetric states, Ban, Kurokawa, Momose, Hirota 1997",
			Objective:   sum * sum / letters,
			Multipliers: map[int][]complex128{0: basis.congruence(root).scaled(sum / letters).packed()},
		},
	}
}

// photonAmplitudes returns c_j: the square root of the Poisson probability that the number of photons is j modulo
// letters.
func photonAmplitudes() []float64 {
	p := make([]float64, letters)
	term := math.Exp(-meanPhotons)
	for n := 0; term > 1e-30; n++ { // the rest is far below rounding
		p[n%letters] += term
		term *= meanPhotons / float64(n+1)
	}
	for j := range p {
		p[j] = math.Sqrt(p[j])
	}
	return p
}

// interferometer returns the unitary of two beam splitters with a phase between them, acting on neighbouring modes.
func interferometer() square {
	u := newSquare(letters)
	for i := range letters {
		u[i][i] = 1
	}
	for step, angle := range []float64{0.7, 0.4, 1.1} {
		s := newSquare(letters)
		for i := range letters {
			s[i][i] = 1
		}
		a, b := step, step+1
		turn := cmplx.Rect(math.Sin(angle), 0.5+float64(step))
		s[a][a], s[a][b] = complex(math.Cos(angle), 0), turn
		s[b][a], s[b][b] = -cmplx.Conj(turn), complex(math.Cos(angle), 0)
		u = s.product(u)
	}
	return u
}
