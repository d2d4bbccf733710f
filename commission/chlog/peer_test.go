//go:build peer

package chlog_test

import (
	"bytes"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
)

// A short script in another language, written from FORMAT.md alone, comes to the same answer as verify.
func TestAReaderWrittenFromTheDocumentAgrees(t *testing.T) {
	check := func(path string) (string, bool) {
		t.Helper()
		out, err := exec.Command("python3", "testdata/check.py", path, "testdata/allowed_signers").CombinedOutput()
		if _, missing := err.(*exec.Error); missing {
			t.Fatal(err)
		}
		return string(out), err == nil
	}
	v := chlog.Verifier{Signers: allow(t, string(read(t, "testdata/allowed_signers"))), Now: now}
	whole, signature := read(t, "testdata/example.chlog"), read(t, "testdata/example.chlog.sig")
	key := testKey(t, "example.key")
	for _, c := range []struct {
		name string
		log  []byte
	}{
		{"whole", whole},
		{"byte changed", bytes.Replace(whole, []byte("712.4"), []byte("712.5"), 1)},
		{"re-chained", rechain(bytes.Replace(whole, []byte("712.4"), []byte("712.5"), 1))},
		{"re-chained with statements", rechainWithStatements(bytes.Replace(whole, []byte("712.4"), []byte("712.5"), 1))},
		{"seal cut", whole[:bytes.LastIndexByte(whole[:len(whole)-1], '\n')+1]},
		{"torn", whole[:len(whole)-3]},
		{"line end lost", whole[:len(whole)-1]},
		{"key twice", rechain(bytes.Replace(whole, []byte(`"age":0.021`), []byte(`"age":0.021,"age":0.021`), 1))},
		{"key in another case", rechain(bytes.Replace(whole, []byte(`"age":0.021`), []byte(`"age":0.021,"Age":0.021`), 1))},
		{"line after the seal", append(bytes.Clone(whole), whole[:300]...)},
	} {
		path := filepath.Join(t.TempDir(), "example.chlog")
		write(t, path, c.log)
		write(t, path+".sig", signature)
		says, theirs := check(path)
		r := v.File(path)
		if ours := r.Exit == 0; ours != theirs || ours != (c.name == "whole") {
			t.Errorf("%s: verify says %s, the script says %s", c.name, r, says)
		}
	}
	if says, _ := check("testdata/example.chlog"); !strings.HasPrefix(says, "REHEARSAL ") {
		t.Errorf("the script says %q of a rehearsal", says)
	}
	fresh := chlogtest.Sealed(t, record.SiteMode, key)
	if says, ok := check(fresh); !ok || strings.Contains(says, "REHEARSAL") {
		t.Errorf("the script says %q of a fresh log", says)
	}
}

// Stock ssh-keygen accepts the detached signature of a log, and its statements on their own.
func TestOpenSSHVerifiesALog(t *testing.T) {
	key := chlogtest.Key(t)
	path := chlogtest.Sealed(t, record.SiteMode, key)
	list := filepath.Join(t.TempDir(), "allowed_signers")
	write(t, list, []byte("tech@example.org "+key.AuthorizedKey()+"\n"))
	verify := func(message []byte, sig string) (string, error) {
		cmd := exec.Command("ssh-keygen", "-Y", "verify", "-f", list, "-I", "tech@example.org", "-n", "chargehand", "-s", sig)
		cmd.Stdin = bytes.NewReader(message)
		out, err := cmd.CombinedOutput()
		return string(out), err
	}
	log := read(t, path)
	if out, err := verify(log, path+".sig"); err != nil {
		t.Errorf("ssh-keygen -Y verify = %s, %v", out, err)
	}
	log[100] ^= 1
	if out, err := verify(log, path+".sig"); err == nil {
		t.Errorf("ssh-keygen -Y verify of a changed log = %s, want an error", out)
	}
	for _, l := range lines(t, read(t, path)) {
		body, err := l.Decode()
		if err != nil {
			t.Fatal(err)
		}
		if s, ok := body.(record.SignOff); ok {
			sig := filepath.Join(t.TempDir(), "statement.sig")
			write(t, sig, []byte(s.Signature))
			if out, err := verify([]byte(s.Statement), sig); err != nil {
				t.Errorf("ssh-keygen -Y verify of record %d's statement = %s, %v", l.Seq, out, err)
			}
		}
	}
}

// A countersignature made by ssh-keygen itself counts like one of ours.
func TestCountersignedByOpenSSH(t *testing.T) {
	key, other := chlogtest.Key(t), filepath.Join(t.TempDir(), "surveyor")
	path := chlogtest.Sealed(t, record.SiteMode, key)
	if out, err := exec.Command("ssh-keygen", "-q", "-t", "rsa", "-b", "2048", "-N", "", "-f", other).CombinedOutput(); err != nil {
		t.Fatalf("ssh-keygen = %s, %v", out, err)
	}
	cmd := exec.Command("ssh-keygen", "-q", "-Y", "sign", "-f", other, "-n", "chargehand", "-O", "hashalg=sha256")
	cmd.Stdin = bytes.NewReader(read(t, path))
	armoured, err := cmd.Output()
	if err != nil {
		t.Fatal(err)
	}
	write(t, path+".2.sig", armoured)
	list := allow(t, "tech@example.org "+key.AuthorizedKey(), "surveyor@example.org "+string(read(t, other+".pub")))
	r := chlog.Verifier{Signers: list, Now: now}.File(path)
	wantReport(t, r, chlog.Unchanged, 0, "and surveyor@example.org (role not stated) signed")
}
