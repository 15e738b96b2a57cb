package send

import (
	"os"
	"testing"

	"thawledger/pipeline/pipelinetest"
)

func TestMain(m *testing.M) {
	if os.Getenv(childDatabase) != "" {
		child()
		return
	}
	pipelinetest.Main(m)
}
