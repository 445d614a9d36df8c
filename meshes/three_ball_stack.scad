// Three balls on one vertical axis over a floor at z = 0; lengths in mm, all invented.
// One part a run: openscad -D 'part="ball"' -D fn=50 ...
//
// OpenSCAD leaves a flat cap at each end of the axis of a sphere.  The balls are stressed at
// their lowest and highest points, so the axis is laid on its side (90 degrees about x) and
// turned a little further, so that neither a cap nor a row of facets meets the z axis squarely.

part = "ball";
fn = 50;

module turned_ball(radius, height) {
    translate([0, 0, height]) rotate([90 + 9.5, 10, 13]) sphere(r = radius, $fn = fn);
}

if (part == "ball") turned_ball(50, 400);
if (part == "tap") turned_ball(30, 270);
if (part == "foot") turned_ball(40, 130);
