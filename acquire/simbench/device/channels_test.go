package device

import (
	"slices"
	"strings"
	"testing"
)

// TestChannels reads lists as SCPI-1999 volume 1, 8.3.2 writes them, and refuses what is none.
func TestChannels(t *testing.T) {
	var got []int
	in, err := New("RINGBOOK,TEST CARD,0,1", nil, []Command{
		{Header: "ROUTe:CLOSe", Min: 1, Max: 1, Do: func(a []Arg) (_ string, err error) { got, err = a[0].Channels(); return "", err }},
	})
	if err != nil {
		t.Fatal(err)
	}
	for list, want := range map[string][]int{
		"(@1)": {1}, "(@1,3:5)": {1, 3, 4, 5}, "( @ 2 , 7 : 6 )": {2, 7, 6}, "(@9999)": {9999}, "(@1:1000)": nil,
	} {
		got = nil
		in.Execute([]byte("ROUT:CLOS " + list))
		if e := string(in.Execute([]byte("SYST:ERR?"))); !strings.HasPrefix(e, "0,") {
			t.Errorf("%s: %s", list, e)
		}
		if want == nil && len(got) != 1000 || want != nil && !slices.Equal(got, want) {
			t.Errorf("%s is %v, want %v", list, got, want)
		}
	}
	for list, code := range map[string]string{
		"(@0)": "-222", "(@10000)": "-222", "(@1:9999)": "-223", "(@)": "-171", "(1)": "-171", "(@1": "-171", "(@1!2)": "-171", "(@1:)": "-171",
		"(@1,,2)": "-171", "(@-1)": "-171", "(@1:99999999999)": "-171", "5": "-104", "'(@1)'": "-104", "(@1)x": "-103", "@1": "-102",
	} {
		in.Execute([]byte("ROUT:CLOS " + list))
		if e := string(in.Execute([]byte("SYST:ERR?"))); !strings.HasPrefix(e, code+",") {
			t.Errorf("%s: %swant %s", list, e, code)
		}
	}
}
