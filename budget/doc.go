// Package budget holds numbers that carry their history: a value, signed shifts
// by named cause, flags, and what it rests on; and the algebra of limits.
package budget
