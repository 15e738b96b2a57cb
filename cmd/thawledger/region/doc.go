// Package region makes up the region that the demo shows: nine stations on an
// invented coast, their weather from 2000 on, and the files that their loggers
// would have sent, with the faults that such files have.
//
// All of it is invented: names, places, weather and design values. The weather
// is a yearly wave with a slow warming and noise that remembers the day before,
// from a seed, so that every run tells the same story.
package region
