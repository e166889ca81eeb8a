# import: meshes good and bad. A tetrahedron, the same without a face, with a face turned, as a soup of triangles.
cat >closed.obj <<'END'
v 0 0 0
v 1 0 0
v 0 1 0
v 0 0 1
f 1 3 2
f 1 2 4
f 2 3 4
f 3 1 4
END
sed '$d' closed.obj >open.obj
sed 's/f 3 1 4/f 1 3 4/' closed.obj >flipped.obj
cat >soup.off <<'END'
OFF
8 3 0
0 0 0
1 0 0
0 1 0
1 0 0
1 1 0
0 1 0
7 7 7
0 0 0
3 0 1 2
3 3 4 5
3 0 7 1
END
cat >quad.ply <<'END'
ply
format ascii 1.0
element vertex 4
property float x
property float y
property float z
element face 1
property list uchar int vertex_indices
end_header
0 0 0
1 0 0
1 1 0
0 1 0
4 0 1 2 3
END
cat >triangle.stl <<'END'
solid one
facet normal 0 0 1
outer loop
vertex 0 0 0
vertex 1 0 0
vertex 0 1 0
endloop
endfacet
endsolid one
END
try import-closed 0 import closed.obj -o closed.h5
filter='s/: [0-9]* bytes, complete/: N bytes, complete/'
try import-closed-info 0 info closed.h5
filter=''
try import-exists 2 import closed.obj -o closed.h5
try import-open 1 import open.obj -o open.h5
try import-open-json 1 import --json --force open.obj -o open.h5
try import-flipped 1 import flipped.obj -o flipped.h5
try import-soup 1 import soup.off -o soup.h5
try import-quad 0 import quad.ply -o quad.h5 --kind cloth --part "a sheet" --half-thickness 0.002 --scale 0.01
filter='s/: [0-9]* bytes, complete/: N bytes, complete/'
try import-quad-info 0 info quad.h5
filter=''
try import-stl 1 import triangle.stl -o stl.h5
try import-cloth-thickness 2 import quad.ply -o x.h5 --kind cloth
try import-kind 2 import quad.ply -o x.h5 --kind hair
try import-no-output 2 import quad.ply
echo 'nothing' >text.obj
try import-no-triangles 2 import text.obj -o x.h5
printf 'OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 0\n3 0 1 7\n' >index.off
try import-index 2 import index.off -o x.h5
printf 'v 0 0 nan\nv 1 0 0\nv 0 1 0\nf 1 2 3\n' >nan.obj
try import-nan 2 import nan.obj -o x.h5
holds import-nothing-left ! -e x.h5
# A numbered sequence of meshes is a shot of poses: check finds the bad frame, reduce works on the interval.
cat >pose1.obj <<'END'
v 0 0 1
v 1 0 1
v 0 1 1
v -2 -2 0
v 3 -2 0
v -2 3 0
f 1 2 3
f 4 5 6
END
sed 's/^v \([01]\) \([01]\) 1/v \1 \2 0.5/' pose1.obj >pose2.obj
sed 's/^v \([01]\) \([01]\) 1/v \1 \2 -0.5/' pose1.obj >pose3.obj
try import-poses 0 import pose1.obj pose2.obj pose3.obj -o seq.h5 --kind cloth --half-thickness 0.001
filter='s/: [0-9]* bytes, complete/: N bytes, complete/'
try import-poses-info 0 info seq.h5
filter=''
try import-poses-check 1 check seq.h5
filter='s/[0-9]* tests/N tests/'
try import-poses-reduce 0 reduce seq.h5 --frame 2 --keep crossing -o found.h5
filter=''
try import-poses-calm 2 reduce seq.h5 --frame 1 --keep crossing -o calm.h5
try import-poses-other 2 import pose1.obj closed.obj -o x.h5
# Two triangles whose corners lie together in the first file only.
printf 'v 0 0 0\nv 1 0 0\nv 0 1 0\nv 1 0 0\nv 1 1 0\nv 0 1 0\nf 1 2 3\nf 4 5 6\n' >torn1.obj
sed '4s/1 0 0/1 0 0.5/' torn1.obj >torn2.obj
try import-poses-torn 2 import torn1.obj torn2.obj -o x.h5 --kind cloth --half-thickness 0.001
holds import-no-poses-left ! -e x.h5
