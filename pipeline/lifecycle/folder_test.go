package lifecycle

import (
	"errors"
	"os/exec"
	"sync"
	"testing"
)

// A process that is being started holds all open files for a moment; it does not
// hold the folder.
func TestReleasedWhileOthersStart(t *testing.T) {
	dir := t.TempDir()
	stop := make(chan struct{})
	var starting sync.WaitGroup
	for range 4 {
		starting.Go(func() {
			for {
				select {
				case <-stop:
					return
				default:
				}
				if err := exec.Command("true").Run(); err != nil {
					t.Error(err)
					return
				}
			}
		})
	}
	for n := range 2000 {
		release, err := LockFolder(dir)
		if err != nil {
			t.Errorf("after %d times: %v", n, err)
			break
		}
		if _, err := LockFolder(dir); !errors.Is(err, ErrFolderInUse) {
			t.Errorf("locked twice: %v", err)
		}
		release()
	}
	close(stop)
	starting.Wait()
}
