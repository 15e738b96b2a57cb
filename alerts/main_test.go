package alerts

import (
	"testing"

	"thawledger/pipeline/pipelinetest"
)

func TestMain(m *testing.M) { pipelinetest.Main(m) }
