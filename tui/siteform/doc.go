// Package siteform is the guided site file: a form over every value of a site file, with what is wrong beside its field and
// the findings moving as values are typed.
//
// Start at [Model]. The fields, their order and what is said of each come from the file itself: its keys and the comments
// behind them. A value is put into the text in place, so comments and everything that is no field stay as they are.
package siteform
