# info: what it prints, and files that are not shots.
make clean a.h5
filter='s/: [0-9]* bytes, /: N bytes, /; s/"bytes": [0-9]*/"bytes": N/'
try info-clean 0 info a.h5
try info-frames 0 info --frames a.h5
try info-json 0 info --json --frames a.h5
make round round.h5
try info-steps 0 info --frames round.h5
make names names.h5
try info-names 0 info names.h5
cp a.h5 'odd name
"quoted".h5'
try info-odd-file 0 info 'odd name
"quoted".h5'
rm -f odd*
cp a.h5 a.h5.part
try info-part 0 info a.h5.part
rm a.h5.part
filter=''
: >empty.h5
try info-empty 2 info empty.h5
echo 'this is no shot' >text.h5
try info-text 2 info text.h5
try info-folder 2 info .
bytes=$(wc -c <a.h5)
for tenth in 1 2 3 4 5 6 7 8 9; do
    head -c $((bytes * tenth / 10)) a.h5 >cut.h5
    try info-cut 2 info cut.h5
done
rm cut.h5 empty.h5 text.h5
if [ -e /dev/full ]; then
    checks=$((checks + 1))
    "$raddle" info a.h5 >/dev/full 2>err
    code=$?
    if [ "$code" -ne 3 ] || ! compare info-full err; then
        fail info-full "exit code $code"
    fi
fi
only a.h5 round.h5 names.h5
