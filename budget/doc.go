// Package budget holds numbers that carry their history: a value, signed shifts
// by named cause, flags, and what it rests on; and the algebra of limits.
//
// # What a Number says
//
// Its flags decide how X is to be read (Kind gives the word):
//
//	value      X ± Err; Up and Lo replace Err where both are above 0
//	marginal   a value between 2σ and the detection threshold
//	upper      the truth lies below X, at Conf σ
//	lower      the truth lies above X
//	interval   the truth lies in X−Lo .. X+Up; Shifts are the errors of its ends
//	none       X is NaN: nothing is known
//
// A Number may carry Interval together with a limit flag, when two reasons to
// doubt it met on the way. It is then read as saying the lesser of the two:
//
//	Interval with Upper   an upper limit at X+Up: its lower end does not hold
//	Interval with Lower   a lower limit at X−Lo: its upper end does not hold
//	Upper with Lower      nothing: none
//
// Plain reduces a Number to that reading; every function here does so first, and
// never returns such a mixture itself.
//
// # Limits of others and our own
//
// Someone else's upper limit is only that. Our own non-detection has a value and
// an error, N ± σ, and N may be negative; Limit keeps them behind the limit (the
// field Behind), so that sums add them as what they are. A limit describes the
// data, not the line (Kashyap et al. 2010, ApJ 719, 900).
package budget
