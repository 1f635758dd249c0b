package grid

import "math"

// widestAngle limits every angle difference, in degrees. The tangents below need less than 90; 60 is far outside
// what a line carries in service and is the choice behind the published bounds that the tests compare with.
const widestAngle = 60

func radians(deg float64) float64 { return deg * math.Pi / 180 }

// span is a range of voltage angle differences in radians.
type span struct{ low, high float64 }

// angleSpan returns the branch's own range, from bus minus to bus.
func (l *Branch) angleSpan() span {
	if l.AngleMinDeg == 0 && l.AngleMaxDeg == 0 {
		return span{radians(-widestAngle), radians(widestAngle)}
	}
	return span{radians(max(l.AngleMinDeg, -widestAngle)), radians(min(l.AngleMaxDeg, widestAngle))}
}

// meet returns the range common to both.
func (s span) meet(o span) span { return span{max(s.low, o.low), min(s.high, o.high)} }

// reversed returns the range seen from the other end.
func (s span) reversed() span { return span{-s.high, -s.low} }

// box returns the smallest rectangle around |V_i| |V_j| exp(j angle) for magnitudes whose product lies between least
// and most and angles in the range.
func (s span) box(least, most float64) (lower, upper complex128) {
	cosLow := math.Min(math.Cos(s.low), math.Cos(s.high))
	cosHigh := 1.0
	if s.low > 0 || s.high < 0 {
		cosHigh = math.Max(math.Cos(s.low), math.Cos(s.high))
	}
	// The sine rises over the range; a negative one is smallest with the larger magnitude.
	pick := func(sine, whenPositive, whenNegative float64) float64 {
		if sine >= 0 {
			return sine * whenPositive
		}
		return sine * whenNegative
	}
	lower = complex(least*cosLow, pick(math.Sin(s.low), least, most))
	upper = complex(most*cosHigh, pick(math.Sin(s.high), most, least))
	return lower, upper
}
