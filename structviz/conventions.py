"""The one page of definitions. Each is shown by the function that obeys it; the examples run as tests.

Frame
-----
Easting, northing, up: right-handed, metres, float64. Angles are degrees at every public edge. Arrays keep the
components on the last axis.

Lines
-----
Trend is the azimuth [0, 360), clockwise from north; plunge is positive down. A directed line keeps its sign, so a negative
plunge points up. An axis has no direction and is given on the lower hemisphere, plunge [0, 90].

>>> from structviz.orientation.lines import trend_plunge_deg, vectors
>>> vectors(90.0, 30.0).round(6)
array([ 0.866025,  0.      , -0.5     ])
>>> [round(float(angle), 6) for angle in trend_plunge_deg(-vectors(90.0, 30.0))]
[90.0, 30.0]

Strike and dip
--------------
Right-hand rule: looking along strike [0, 360) the plane dips, [0, 90], to the right. The sign of a normal does not matter.

>>> from structviz.orientation.planes import normals, strike_dip_deg
>>> n = normals(30.0, 60.0)  # strikes 030, dips 60 towards 120
>>> [round(float(angle), 6) for angle in strike_dip_deg(-n)]
[30.0, 60.0]

Hanging wall
------------
The normal of a fault points from foot wall to hanging wall; for a dip under 90 degrees it points up. It is chosen once
for a whole surface, not triangle by triangle: where a steep fault overturns, the moving block stays the same, and its normal
points down there.

>>> bool(n[2] > 0)
True

Rake
----
The slip of the hanging wall, measured in the fault from the strike direction upwards, (-180, 180]: 0 sinistral, 180 dextral,
90 reverse, -90 normal [aki1980]. On a mirrored model sinistral becomes dextral: the rake becomes 180 less itself.

>>> from structviz.orientation.planes import rakes_deg, slip_vectors
>>> slip_vectors(n, -90.0).round(6)  # normal: down the dip
array([ 0.433013, -0.25    , -0.866025])
>>> round(float(rakes_deg(n, [0.5, 0.866025403784, 0.0])), 6) + 0.0  # along strike: sinistral
0.0

Vertical faults
---------------
A vertical plane has no hanging wall by nature. The side its normal points to counts as one, and strike is the one with that
side on its right. Horizontal slip is told the same from either side; a dip-slip word must say which side went down.

>>> east_side = normals(0.0, 90.0)
>>> float(strike_dip_deg(east_side)[0]), float(strike_dip_deg(-east_side)[0])
(0.0, 180.0)
>>> from_west = rakes_deg(-east_side, -slip_vectors(east_side, 180.0))  # the west side moves the other way: still dextral
>>> round(float(from_west), 6)
180.0
>>> round(float(rakes_deg(-east_side, -slip_vectors(east_side, -90.0))), 6)  # east side down, told from the west side: reverse
90.0

Level planes
------------
A level plane has no strike; it is given as 0, and rake is measured from north.

>>> [float(angle) for angle in strike_dip_deg([0.0, 0.0, 1.0])]
[0.0, 0.0]

Stress
------
Compression is positive, sigma1 >= sigma2 >= sigma3. Axes are unit rows sigma1, sigma2, sigma3. Geometry and slip yield only
the reduced tensor: the axes and the shape ratio R = (sigma2 - sigma3)/(sigma1 - sigma3), with values (1, R, 0). Some papers
call 1 - R by the name R; structviz never does.

>>> from structviz.stress.tensor import principal, reduced_tensor
>>> extension_west_east = reduced_tensor([[0, 0, 1], [0, 1, 0], [1, 0, 0]], 0.25)
>>> extension_west_east.diagonal()
array([0.  , 0.25, 1.  ])
>>> round(float(principal(extension_west_east)[2]), 6)
0.25

Slip from stress
----------------
The hanging wall moves along minus the shear part of S n, for n pointing into it [wallace1951] [bott1959].

>>> from structviz.kinematics.slip import resolved_slip
>>> east_dipping = normals(0.0, 60.0)
>>> round(float(rakes_deg(east_dipping, resolved_slip(extension_west_east, east_dipping))), 6)
-90.0

Slip tendency
-------------
Shear over normal stress as a share of the greatest on any plane, in the state where the best oriented plane is about to slip
at the friction stated [morris1996]. So it is 1 for that plane and 0 where there is no shear. It is not a measure of stability.

>>> from structviz.stress.tensor import slip_tendency
>>> import numpy as np
>>> best = normals(0.0, 45.0 + np.degrees(np.arctan(0.6)) / 2)
>>> round(float(slip_tendency(extension_west_east, best, friction=0.6)), 6)
1.0

Greatest horizontal compression
-------------------------------
SHmax is the greater axis of the horizontal part of the whole tensor, [0, 180). It is not the trend of sigma1 when the axes are
inclined, and it then depends on R [lund2007].

>>> from structviz.stress.classify import kinds, shmax_deg
>>> axes = [[0, 0, 1], [0, 1, 0], [1, 0, 0]]
>>> str(kinds(axes)), float(shmax_deg(axes, 0.25))
('normal', 0.0)

Net
---
Equal-area, lower hemisphere, primitive of radius 1, north up.

>>> from structviz.orientation.projection import equal_area
>>> equal_area(vectors(45.0, 30.0)).round(6)
array([0.5, 0.5])
"""
