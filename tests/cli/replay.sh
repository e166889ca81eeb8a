# replay: the same bits again, what differs and where, and input that cannot be replayed.
for kind in resolve resolve32 wrong poses nan; do
    make "$kind" "$kind.h5"
done
"$raddle" resolve resolve.h5 -o a.h5 >out
"$raddle" resolve resolve32.h5 -o a32.h5 >out
"$raddle" resolve resolve.h5 -o aim.h5 --aim-margin 4e-6 >out
try replay-equal 0 replay a.h5
try replay-float 0 replay a32.h5
try replay-frames 0 replay a.h5 --frames 1:2 --threads 3
try replay-override 0 replay a.h5 --vector off --passes-max 41
filter='s/"seconds": .*/"seconds": S/; s/"threads": [0-9]*/"threads": T/'
try replay-json 0 replay --json a.h5 --frames 0 --vector off
filter='s/^  now .*/  now: VALUES/'
try replay-wrong 1 replay wrong.h5
filter='s/^# now: .*/# now: VALUES/'
cp a.h5 'odd name
"quoted".h5'
try replay-tap 1 replay --tap a.h5 wrong.h5 'odd name
"quoted".h5' absent.h5
rm odd*
filter=''
# A trace: kept in the shot, compared with, and no longer needed to replay.
try replay-trace 0 replay a.h5 --trace
try replay-traced 0 replay a.h5
try replay-against-itself 0 replay a.h5 --against a.h5 --vector off
filter='s/^  this shot .*/  this shot: VALUES/; s/^  the other: .*/  the other: VALUES/'
try replay-against-margin 1 replay a.h5 --against aim.h5
try replay-against-setting 1 replay a.h5 --against a.h5 --aim-margin 4e-6
try replay-against-input 1 replay a.h5 --against wrong.h5
filter='/^What the engine did/,$d; s/ (series order [0-9]*, [0-9]* halvings)/ (ORDER)/'
try replay-explain 0 replay a.h5 --frames 0 --explain pt:0:1
try replay-explain-edges 0 replay a.h5 --frames 0 --explain ee:2-3:5-6
try replay-explain-driven 0 replay a.h5 --frames 0 --explain ee:6:8
filter=''
try replay-explain-shared 2 replay a.h5 --frames 0 --explain ee:0:0
try replay-explain-text 2 replay a.h5 --frames 0 --explain 3:4
try replay-explain-vertex 2 replay a.h5 --frames 0 --explain pt:99:0
try replay-explain-triangle 2 replay a.h5 --frames 0 --explain pt:0:99
try replay-explain-edge 2 replay a.h5 --frames 0 --explain ee:0-9:3
try replay-explain-frames 2 replay a.h5 --frames 0:1 --explain pt:0:1
try replay-no-delivered 2 replay resolve.h5
try replay-poses 2 replay poses.h5
try replay-nan 2 replay nan.h5 --trace
try replay-frames-beyond 2 replay a.h5 --frames 3
try replay-frames-text 2 replay a.h5 --frames 1:x
try replay-two 2 replay a.h5 aim.h5
try replay-two-jobs 2 replay a.h5 --trace --against aim.h5
try replay-against-absent 2 replay a.h5 --against absent.h5
try replay-setting 2 replay a.h5 --vector maybe
# A digest that does not fit the delivered bits: one byte of it is changed, and its checksum with it.
"$make_shot" flip-digest a.h5 || fail replay-digest 'no change made'
try replay-digest 2 replay a.h5
"$make_shot" odd-setting aim.h5 || fail replay-odd-setting 'no change made'
try replay-odd-setting 2 replay aim.h5
only a.h5 a32.h5 aim.h5 nan.h5 poses.h5 resolve.h5 resolve32.h5 wrong.h5
