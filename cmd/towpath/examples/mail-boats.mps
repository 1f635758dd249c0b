* Two boats, X and Y, carry mail and fuel between the isles: how many trips of each a day at least cost?
* 9.5 at X = 1.5, Y = 2.5: mail needs x + y >= 4, y has at most 2.5 trips.
NAME          mail-boats
ROWS
 N  cost
 G  mail
 G  fuel
COLUMNS
 X  cost  3  mail  1
 X  fuel  1
 Y  cost  2  mail  1
 Y  fuel  3
RHS
 need  mail  4  fuel  6
BOUNDS
 UP most  X  3
 UP most  Y  2.5
ENDATA
