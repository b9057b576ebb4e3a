package accept
import ("testing";"os";"strconv";"fmt";"context")
func TestOne(t *testing.T) {
	n,_ := strconv.ParseUint(os.Getenv("ONE"),10,64)
	if n==0 {return}
	f := &fuzzed{dir: t.TempDir(), t: t}
	f.writeRecords()
	text, flags := draw(n)
	if os.Getenv("SHOW")!="" { fmt.Println(text, flags) }
	s, err := f.scenario(n)
	if err != nil { fmt.Println("ERR", err); return }
	v, err := Run(context.Background(), s, Options{})
	if err != nil { fmt.Println("ERR", err); return }
	v.WriteText(os.Stdout, false)
	if os.Getenv("SHOW")!="" { b,_ := encode(v); fmt.Println(string(b)) }
	fmt.Println("TRY", f.try(n))
}
