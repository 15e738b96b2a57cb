// Package text puts a notice into words: a subject, plain text, HTML, charts.
//
//	Notice -> View (sentences and figures, ready to print) -> templates -> Written
//
// What is said is decided here, in Go; the templates only lay it out. An agency
// can put any of subject.txt, notice.txt and notice.html of its own in a folder;
// those that it leaves out are the built-in ones. They are Go templates
// (text/template, html/template) over a View. Load tries them on every sample
// notice, so that a fault in them is found when the program starts, and named by
// file and line, and not on the night when a message has to go out.
//
// The words are plain English and the states are those of pipeline.State, in a
// sentence. Figures are never rounded onto their design value: 1699.7 of 1700
// stays 1699.7.
package text
