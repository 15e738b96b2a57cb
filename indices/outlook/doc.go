// Package outlook says what a season that is not over may come to. It is pure:
// no I/O, no clock.
//
//	daily means of a record -> NewRecord -> Record.Outlook -> Outlook: chance of
//	passing a threshold, on which date, and the index at the season's end
//	                                     -> Record.Hindcast -> Hindcast: what such
//	outlooks of past seasons were worth
//
// Every past year whose days from the date of issue to the end of the thaw
// (freeze) year are all known is one member: its remaining daily means, by month
// and day, are joined to this year's, and the index of the joined path is worked
// out by the same definition as any other season's. The low and the high of the
// curve may lie on either side of the joint, so that the remaining accumulation
// is never just added to the index to date. This is the method of historical
// traces, long used for river flow (G. N. Day, 1985, "Extended streamflow
// forecasting using NWSRFS", Journal of Water Resources Planning and Management
// 111; from memory).
//
// There are two sets. Raw takes past years as they were. Moved shifts each day of
// a member by the trend between its year and this one: the Theil-Sen slope of
// three-month means, for each month of the year. Which of them is used is decided
// by the hindcast, and so is whether anything may be announced at all.
//
// It promises: at the end of a season the probability is that of the fact, but
// for the plotting rule; of the raw set, warmth added to this year's path or to a
// member never lowers the chance of passing a thawing index or raises that of a
// freezing one; of the moved set, the same for this year's path. A hindcast of a
// season uses no day of that season after the date of issue, and no later one
// unless that is asked for.
//
// It refuses to make an outlook of fewer than twenty members (a hindcast: ten).
package outlook
