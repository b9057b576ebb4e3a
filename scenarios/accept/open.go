package accept

import (
	"maps"

	"antelag/rtloop"
	"antelag/scenarios/kind"
)

// JudgeTracking holds the figures of a lane whose loop was open, or of a record,
// against those limits that are on tracking alone: without a loop nothing can be
// said of energy margin and response.
func JudgeTracking(res rtloop.LaneResult, limits kind.Values) Lane {
	tracking := maps.Clone(limits)
	delete(tracking, "energy_margin")
	delete(tracking, "response_error")
	return judge(res, tracking)
}
