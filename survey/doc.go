// Package survey runs the whole chain for every sightline of a configuration
// and keeps what it finds in a journal. It alone knows the chain.
package survey
