// Package grid writes convex relaxations of AC optimal power flow as models: the cheapest dispatch of a power network
// with the voltage products W_ij = V_i conj(V_j) as unknowns, of which the condition "W has rank one" is relaxed.
//
//   - SecondOrder keeps |W_ij|^2 <= W_ii W_jj for connected buses (R. Jabr, "Radial distribution load flow using conic
//     programming", IEEE Trans. Power Systems 21(3), 2006), as rotated lorentz cones;
//   - Pairwise is the same set written as 2 x 2 Hermitian matrices;
//   - Semidefinite keeps the whole Hermitian matrix W positive semidefinite (X. Bai, H. Wei, K. Fujisawa, Y. Wang,
//     "Semidefinite programming for optimal power flow problems", Int. J. Electrical Power & Energy Systems 30, 2008;
//     J. Lavaei, S. Low, "Zero duality gap in optimal power flow problem", IEEE Trans. Power Systems 27(1), 2012).
//
// Each optimum is a lower bound on the cost of every AC operating point within the limits, and
// SecondOrder = Pairwise <= Semidefinite. (Papers cited from memory.)
//
// The bounds are planning figures. They are advisory: operating a network is a matter of its operator's procedures
// and of licensed engineers.
package grid
