package report

import "context"

// stability shows how far the loop is from instability.
func (r *run) stability(_ context.Context) []Part { return nil }
