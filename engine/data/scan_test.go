package data

import "testing"

func TestSmoke(t *testing.T) {
	j := `{"a": ["x", "y", 1, "1"], "y": [1000000000000.4, 1000000000000.3, 1e12, -3.50], "z": [1,2,{"q":null},4]}`
	c, f, err := ScanJSON([]byte(j), Plan{Factors: []string{"a"}, Responses: []string{"y"}})
	t.Log(c, f, err)
	k, f := ScanCSV([]byte("a,y,z\nx,1000000000000.4,1\ny,1000000000000.3,2\n1,1e12,\"a,b\"\n1, +-3.50 ,4"), Plan{Factors: []string{"a"}, Responses: []string{"y"}})
	t.Log(k, f)
	k, f = ScanCSV([]byte("a,y,z\nx,1000000000000.4,1\ny,1000000000000.3,2\n1,1e12,\"a,b\"\n1, -3.50 ,4"), Plan{Factors: []string{"a"}, Responses: []string{"y"}})
	t.Log(k, f)
}
