// Package settings reads settings.yaml. It is strict: a key that is unknown or
// given twice is a fault, units and zones are never guessed, and all faults are
// reported at once, each with file, line and column, what is wrong and what
// would be right. It starts nothing and opens nothing but the files that the
// settings name (a stations table, secrets).
package settings
