// A square measuring plate inside a guard frame, and a driven plate opposite; lengths in mm,
// all invented.  Flat faces and sharp edges only.
// One part a run: openscad -D 'part="plate"' ...

part = "plate";

side = 20;        // measuring plate
slit = 1;         // between plate and guard, all around
rim = 10;         // width of the guard frame
thickness = 2;    // plate and guard
gap = 3;          // from plate to driven plate
drive_side = 32;  // driven plate
drive_thickness = 3;

inner = side + 2 * slit;
outer = inner + 2 * rim;

if (part == "plate") linear_extrude(thickness) square(side, center = true);
if (part == "guard") linear_extrude(thickness) difference() {
    square(outer, center = true);
    square(inner, center = true);
}
if (part == "drive") translate([0, 0, thickness + gap])
    linear_extrude(drive_thickness) square(drive_side, center = true);
