//go:build !peer

package chlog_test

const everyValue = false
