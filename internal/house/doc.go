// Package house holds no code: its tests guard the shape of the whole
// repository, the import arrows, the public surface and the documents.
package house
