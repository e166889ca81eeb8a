# export: files, their text, and none when something is in the way.
make cross a.h5
try export-obj 0 export a.h5 -o o
holds export-three -f o0000.obj -a -f o0001.obj -a -f o0002.obj
checks=$((checks + 1))
cp o0001.obj out
compare export-obj-text out || fail export-obj-text "other text"
mkdir folder
try export-ply 0 export a.h5 -o folder --format ply --frames 1:2 --which start
holds export-two ! -e folder/0000.ply -a -f folder/0001.ply -a -f folder/0002.ply
checks=$((checks + 1))
cp folder/0001.ply out
compare export-ply-text out || fail export-ply-text "other text"
rm o0000.obj o0002.obj
try export-in-the-way 2 export a.h5 -o o
holds export-nothing-new ! -e o0000.obj -a ! -e o0002.obj
try export-force 0 export a.h5 -o o --force --frames 1
holds export-only-one ! -e o0000.obj -a ! -e o0002.obj
try export-frames 2 export a.h5 -o p --frames 2:5
try export-frames-text 2 export a.h5 -o p --frames two
try export-which 2 export a.h5 -o p --which later
try export-format 2 export a.h5 -o p --format fbx
try export-no-output 2 export a.h5
try export-no-folder 2 export a.h5 -o no/such/p
make nan nan.h5
try export-nan 2 export nan.h5 -o n --which proposed
rm -r folder o0001.obj
only a.h5 nan.h5
