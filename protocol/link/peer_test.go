//go:build peer

package link_test

import (
	"bufio"
	"bytes"
	"encoding/binary"
	"encoding/hex"
	"flag"
	"fmt"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
)

var update = flag.Bool("update", false, "write the servers' frames to testdata")

// TestLibmodbus reads from a libmodbus server, built from testdata/libmodbus_server.c.
func TestLibmodbus(t *testing.T) {
	server := filepath.Join(t.TempDir(), "server")
	build := exec.Command("sh", "-c", `gcc -O1 -Wall -o "$0" testdata/libmodbus_server.c $(pkg-config --cflags --libs libmodbus)`, server)
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	peer(t, exec.Command(server), "libmodbus.frames",
		"# libmodbus 3.1.6, testdata/libmodbus_server.c: request and answer without transaction, written by\n"+
			"# go test -tags peer -run TestLibmodbus ./protocol/link -update\n")
}

// TestPymodbus reads from a pymodbus server. The interpreter is the system's, which sees the system's packages.
func TestPymodbus(t *testing.T) {
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	_, port, _ := net.SplitHostPort(ln.Addr().String())
	ln.Close()
	peer(t, exec.Command("/usr/bin/python3", "testdata/pymodbus_server.py", port), "pymodbus.frames",
		"# pymodbus 3.0.0.rc1, testdata/pymodbus_server.py: request and answer without transaction, written by\n"+
			"# go test -tags peer -run TestPymodbus ./protocol/link -update\n")
}

// recording is frames with the order they came in.
type recording struct {
	frames
	mu    sync.Mutex
	order []string
}

func (f *recording) keep(request, answer []byte) {
	f.mu.Lock()
	defer f.mu.Unlock()
	key := hex.EncodeToString(request[2:])
	if f.answers[key] == nil {
		f.order = append(f.order, key)
	}
	f.answers[key] = append([]byte(nil), answer[2:]...)
}

func (f *recording) text(head string) []byte {
	var b bytes.Buffer
	b.WriteString(head)
	for _, k := range f.order {
		fmt.Fprintf(&b, "%s %s\n", k, hex.EncodeToString(f.answers[k]))
	}
	return b.Bytes()
}

// peer starts a server that prints its port, reads from it through a recording proxy, and compares the order of its checks.
func peer(t *testing.T, server *exec.Cmd, stored, head string) {
	t.Helper()
	server.Stderr = os.Stderr
	in, err := server.StdinPipe() // held open: a server may end when its input does
	if err != nil {
		t.Fatal(err)
	}
	out, err := server.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := server.Start(); err != nil {
		t.Fatal(err)
	}
	defer func() {
		in.Close()
		server.Process.Kill()
		server.Wait()
	}()
	line, err := bufio.NewReader(out).ReadString('\n')
	port, err2 := strconv.Atoi(strings.TrimSpace(line))
	if err != nil || err2 != nil {
		t.Fatalf("the server printed %q, %v, want its port", line, err)
	}
	address := net.JoinHostPort("127.0.0.1", strconv.Itoa(port))
	l := link.New(link.Options{Address: address})
	checkPeer(t, l)
	l.Close()

	f := &recording{frames: frames{answers: map[string][]byte{}}}
	conn, err := net.DialTimeout("tcp", address, 3*time.Second)
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	conn.SetDeadline(time.Now().Add(10 * time.Second))
	ask := func(request []byte) []byte {
		if _, err := conn.Write(request); err != nil {
			t.Fatal(err)
		}
		answer, err := linktest.ReadRequest(conn)
		if err != nil {
			t.Fatal(err)
		}
		return answer
	}
	p := linktest.NewProxy(func(request []byte) []byte {
		answer := ask(request)
		f.keep(request, answer)
		return answer
	})
	defer p.Close()
	through := link.New(link.Options{Address: address, Dial: p.Dial})
	defer through.Close()
	checkPeer(t, through)
	if *update {
		if err := os.WriteFile(filepath.Join("testdata", stored), f.text(head), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	old := readFrames(t, stored)
	for k, a := range f.answers {
		if string(old.answers[k]) != string(a) {
			t.Errorf("answer to %s = %x, stored %x", k, a, old.answers[k])
		}
	}
	// The order of the checks of APP V1.1b3, 7: quantity before address. The played server must agree with the real one.
	image := &linktest.Image{}
	image.Remove(1, 3, 500)
	for _, tt := range []struct {
		address, quantity uint16
	}{{500, 0}, {500, 126}, {500, 1}} {
		request := linktest.Frame(7, 1, 3, byte(tt.address>>8), byte(tt.address), byte(tt.quantity>>8), byte(tt.quantity))
		got, want := ask(request), image.Answer(request)
		if string(got) != string(want) {
			t.Errorf("answer to %d registers from %d = % x, the played server's % x", tt.quantity, tt.address, got, want)
		}
		if binary.BigEndian.Uint16(got) != 7 {
			t.Errorf("answer of transaction %d, want 7", binary.BigEndian.Uint16(got))
		}
	}
}
