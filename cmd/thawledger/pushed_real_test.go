package main

import (
	"context"
	"fmt"
	"io"
	"net"
	"net/http"
	"strings"
	"syscall"
	"testing"
	"time"
)

// Files are pushed to the running daemon; the answer says what became of them,
// and the same push twice is one batch.
func TestPushed(t *testing.T) {
	free, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	address := free.Addr().String()
	free.Close()
	settings := strings.Replace(fmt.Sprintf(hourlySettings, "Z", ""), "folder: feed,", "push: {token_file: token, max_megabytes: 1},", 1) +
		fmt.Sprintf("push: {listen: %q}\n", address)
	p := newPlace(t, settings, map[string]string{"token": "token of tarn\n"})
	d := p.start(t, "run")
	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	push := func(body string) (int, string) {
		for {
			req, err := http.NewRequestWithContext(ctx, "POST", "http://"+address+"/feeds/tarn", strings.NewReader(body))
			if err != nil {
				t.Fatal(err)
			}
			req.Header.Set("Authorization", "Bearer token of tarn")
			got, err := http.DefaultClient.Do(req)
			if err != nil { // not up yet
				select {
				case <-ctx.Done():
					t.Fatalf("%v\n%s", err, d.said())
				case <-time.After(20 * time.Millisecond):
				}
				continue
			}
			defer got.Body.Close()
			text, _ := io.ReadAll(got.Body)
			return got.StatusCode, string(text)
		}
	}
	for _, c := range []struct {
		body   string
		status int
		says   string
	}{
		{hours(0, 1, 2, 3, 4, 5) + "2025-07-10 05:00,x\n", 201, `"state":"read","rows":6,"rows_read":5,"rows_without_value":0,"rows_set_aside":1`},
		{hours(0, 1, 2, 3, 4, 5) + "2025-07-10 05:00,x\n", 200, `"state":"known"`},
		{"when,t\n", 202, `no column \"time\"`},
		{gzipped(hours(8, 1)), 201, `"rows":1`},
		{strings.Repeat("x", 2<<20), 413, "1048576 bytes"},
	} {
		if status, said := push(c.body); status != c.status || !strings.Contains(said, c.says) {
			t.Errorf("%d %s; want %d and %s", status, said, c.status, c.says)
		}
	}
	http.DefaultClient.CloseIdleConnections()
	if err := d.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	<-d.ended
	if d.err != nil {
		t.Errorf("%v\n%s", d.err, d.said())
	}
	if got := p.rows(t, `select count(*) from thaw.batches`); got[0] != "(3)" {
		t.Errorf("batches %v", got)
	}
}
