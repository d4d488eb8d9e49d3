package store

import (
	"fmt"
	"strings"
	"testing"
	"time"
)

// TestTrialsAreNotSorted looks into SQLite's plans: the common scopes are read in an index's order, so that the first
// trial comes at once and a million need no more memory than one.
func TestTrialsAreNotSorted(t *testing.T) {
	lb := openTemp(t)
	mustAdd(t, lb, example())
	for name, s := range map[string]struct {
		Scope
		index string
	}{
		"all":        {Scope{}, "SCAN t USING INDEX trial_by_time"},
		"struck too": {Scope{IncludeStruck: true}, "SCAN t USING INDEX trial_by_time"},
		"a time":     {Scope{Since: time.Now(), Until: time.Now()}, "SEARCH t USING INDEX trial_by_time (at>? AND at<?)"},
		"a revision": {Scope{Board: "Kestrel", Revision: "B"}, "SEARCH t USING INDEX trial_by_revision (revision=?)"},
		"since":      {Scope{Board: "Kestrel", Revision: "B", Since: time.Now()}, "SEARCH t USING INDEX trial_by_revision (revision=? AND at>?)"},
	} {
		picked, args := s.picked()
		for _, query := range []string{selectTrials, selectReadings, selectRepeats} {
			rows, err := lb.db.QueryContext(t.Context(), "EXPLAIN QUERY PLAN "+fmt.Sprintf(query, picked, inTime), args...)
			if err != nil {
				t.Fatal(err)
			}
			var plan []string
			for rows.Next() {
				var a, b, c int
				var step string
				if err := rows.Scan(&a, &b, &c, &step); err != nil {
					t.Fatal(err)
				}
				plan = append(plan, step)
			}
			if err := rows.Err(); err != nil {
				t.Fatal(err)
			}
			for i, step := range plan {
				inSubquery := i > 0 && strings.Contains(plan[i-1], "SCALAR SUBQUERY") || i > 1 && strings.Contains(plan[i-2], "SCALAR SUBQUERY")
				if strings.Contains(step, "TEMP B-TREE") && !inSubquery {
					t.Errorf("%s sorts:\n%s", name, strings.Join(plan, "\n"))
				}
			}
			if plan[0] != s.index && !strings.HasPrefix(plan[0], strings.Replace(s.index, "INDEX", "COVERING INDEX", 1)) {
				t.Errorf("%s: %q first; want %q", name, plan[0], s.index)
			}
		}
	}
}
