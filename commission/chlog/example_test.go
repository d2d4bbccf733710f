package chlog_test

import (
	"fmt"
	"os"
	"path/filepath"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/record"
	"chargehand/commission/signing"
)

// A log from its first record to what verify says of it.
func Example() {
	dir, err := os.MkdirTemp("", "log")
	if err != nil {
		panic(err)
	}
	defer os.RemoveAll(dir)
	key, err := signing.Generate()
	if err != nil {
		panic(err)
	}
	w, err := chlog.Create(chlog.Disk{}, filepath.Join(dir, "wagtail.chlog"), record.Opened{Mode: record.RehearsalMode, Program: "1.0.0", Speed: 1},
		chlog.Options{Now: time.Now, Recorded: func(l chlog.Line) { fmt.Println("seq", l.Seq, l.Kind) }})
	if err != nil {
		panic(err)
	}
	w.Append(record.Person{ID: "p1", Name: "A. Example", Role: "technician"})
	w.SignOff("p1", "charge.curve", key, "")
	w.Seal("p1", "pass", key, "")
	w.Close()
	if _, err := chlog.SignFile(w.Path(), key); err != nil {
		panic(err)
	}
	r := chlog.Verifier{Now: time.Now}.File(w.Path())
	fmt.Println(r.Rehearsal, r.Outcome, r.Exit)
	// Output:
	// seq 0 opened
	// seq 1 person
	// seq 2 sign-off
	// seq 3 seal
	// true consistent 0
}
