Priority encoder for eight requests, drawn flat
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* r0 comes before r1, r1 before r2, and r7 is last. y2 y1 y0 name the first request that is up;
* any tells that there is one at all. k<i>: one of r0 to r<i> is up; k<i>n: none of them is.
* No hierarchy: every transistor stands here by itself, as an old schematic exported it.

.global vdd! vss!
vdd vdd! 0 dc 1.8
vss vss! 0 0

* the even requests, complemented for the NAND gates of the chain
mn0i   r0n   r0    vss!  vss!  nsh  w=0.6u l=0.18u
mp0i   r0n   r0    vdd!  vdd!  psh  w=1.2u l=0.18u
mn2i   r2n   r2    vss!  vss!  nsh  w=0.6u l=0.18u
mp2i   r2n   r2    vdd!  vdd!  psh  w=1.2u l=0.18u
mn4i   r4n   r4    vss!  vss!  nsh  w=0.6u l=0.18u
mp4i   r4n   r4    vdd!  vdd!  psh  w=1.2u l=0.18u
mn6i   r6n   r6    vss!  vss!  nsh  w=0.6u l=0.18u
mp6i   r6n   r6    vdd!  vdd!  psh  w=1.2u l=0.18u

* the chain: NOR, NAND, NOR ... the same small gates all the way down, late input on top
mnk1a  k1n   r1    vss!  vss!  nsh  w=0.5u l=0.18u
mnk1b  k1n   r0    vss!  vss!  nsh  w=0.5u l=0.18u
mpk1a  k1n   r1    xk1   vdd!  psh  w=2.0u l=0.18u
mpk1b  xk1   r0    vdd!  vdd!  psh  w=2.0u l=0.18u
mnk2a  k2    k1n   xk2   vss!  nsh  w=1.0u l=0.18u
mnk2b  xk2   r2n   vss!  vss!  nsh  w=1.0u l=0.18u
mpk2a  k2    k1n   vdd!  vdd!  psh  w=1.0u l=0.18u
mpk2b  k2    r2n   vdd!  vdd!  psh  w=1.0u l=0.18u
mnk3a  k3n   k2    vss!  vss!  nsh  w=0.5u l=0.18u
mnk3b  k3n   r3    vss!  vss!  nsh  w=0.5u l=0.18u
mpk3a  k3n   k2    xk3   vdd!  psh  w=2.0u l=0.18u
mpk3b  xk3   r3    vdd!  vdd!  psh  w=2.0u l=0.18u
mnk4a  k4    k3n   xk4   vss!  nsh  w=1.0u l=0.18u
mnk4b  xk4   r4n   vss!  vss!  nsh  w=1.0u l=0.18u
mpk4a  k4    k3n   vdd!  vdd!  psh  w=1.0u l=0.18u
mpk4b  k4    r4n   vdd!  vdd!  psh  w=1.0u l=0.18u
mnk5a  k5n   k4    vss!  vss!  nsh  w=0.5u l=0.18u
mnk5b  k5n   r5    vss!  vss!  nsh  w=0.5u l=0.18u
mpk5a  k5n   k4    xk5   vdd!  psh  w=2.0u l=0.18u
mpk5b  xk5   r5    vdd!  vdd!  psh  w=2.0u l=0.18u
mnk6a  k6    k5n   xk6   vss!  nsh  w=1.0u l=0.18u
mnk6b  xk6   r6n   vss!  vss!  nsh  w=1.0u l=0.18u
mpk6a  k6    k5n   vdd!  vdd!  psh  w=1.0u l=0.18u
mpk6b  k6    r6n   vdd!  vdd!  psh  w=1.0u l=0.18u
mnk7a  k7n   k6    vss!  vss!  nsh  w=0.5u l=0.18u
mnk7b  k7n   r7    vss!  vss!  nsh  w=0.5u l=0.18u
mpk7a  k7n   k6    xk7   vdd!  psh  w=2.0u l=0.18u
mpk7b  xk7   r7    vdd!  vdd!  psh  w=2.0u l=0.18u

* complements for the odd grants, and the answer whether anybody asked
mnk2i  k2n   k2    vss!  vss!  nsh  w=0.8u l=0.18u
mpk2i  k2n   k2    vdd!  vdd!  psh  w=1.8u l=0.18u
mnk4i  k4n   k4    vss!  vss!  nsh  w=0.8u l=0.18u
mpk4i  k4n   k4    vdd!  vdd!  psh  w=1.8u l=0.18u
mnk6i  k6n   k6    vss!  vss!  nsh  w=0.8u l=0.18u
mpk6i  k6n   k6    vdd!  vdd!  psh  w=1.8u l=0.18u
mnany  any   k7n   vss!  vss!  nsh  w=1.6u l=0.18u
mpany  any   k7n   vdd!  vdd!  psh  w=3.6u l=0.18u

* grants, low for the winner; those of the even requests were copied from a wider cell
* and weigh on the chain more than its own next link does
mng1a  g1n   r0n   xg1   vss!  nsh  w=1400n l=0.18u
mng1b  xg1   r1    vss!  vss!  nsh  w=1400n l=0.18u
mpg1a  g1n   r0n   vdd!  vdd!  psh  w=1400n l=0.18u
mpg1b  g1n   r1    vdd!  vdd!  psh  w=1400n l=0.18u
mng2a  g2n   k1n   xg2   vss!  nsh  w=3200n l=0.18u
mng2b  xg2   r2    vss!  vss!  nsh  w=3200n l=0.18u
mpg2a  g2n   k1n   vdd!  vdd!  psh  w=3200n l=0.18u
mpg2b  g2n   r2    vdd!  vdd!  psh  w=3200n l=0.18u
mng3a  g3n   k2n   xg3   vss!  nsh  w=1400n l=0.18u
mng3b  xg3   r3    vss!  vss!  nsh  w=1400n l=0.18u
mpg3a  g3n   k2n   vdd!  vdd!  psh  w=1400n l=0.18u
mpg3b  g3n   r3    vdd!  vdd!  psh  w=1400n l=0.18u
mng4a  g4n   k3n   xg4   vss!  nsh  w=3200n l=0.18u
mng4b  xg4   r4    vss!  vss!  nsh  w=3200n l=0.18u
mpg4a  g4n   k3n   vdd!  vdd!  psh  w=3200n l=0.18u
mpg4b  g4n   r4    vdd!  vdd!  psh  w=3200n l=0.18u
mng5a  g5n   k4n   xg5   vss!  nsh  w=1400n l=0.18u
mng5b  xg5   r5    vss!  vss!  nsh  w=1400n l=0.18u
mpg5a  g5n   k4n   vdd!  vdd!  psh  w=1400n l=0.18u
mpg5b  g5n   r5    vdd!  vdd!  psh  w=1400n l=0.18u
mng6a  g6n   k5n   xg6   vss!  nsh  w=3200n l=0.18u
mng6b  xg6   r6    vss!  vss!  nsh  w=3200n l=0.18u
mpg6a  g6n   k5n   vdd!  vdd!  psh  w=3200n l=0.18u
mpg6b  g6n   r6    vdd!  vdd!  psh  w=3200n l=0.18u
mng7a  g7n   k6n   xg7   vss!  nsh  w=1400n l=0.18u
mng7b  xg7   r7    vss!  vss!  nsh  w=1400n l=0.18u
mpg7a  g7n   k6n   vdd!  vdd!  psh  w=1400n l=0.18u
mpg7b  g7n   r7    vdd!  vdd!  psh  w=1400n l=0.18u

* index: each bit is the OR of four grants, the latest of them next to the output
mny0a  z0    g7n   xy01  vss!  nsh  w=1.8u l=0.18u
mny0b  xy01  g5n   xy02  vss!  nsh  w=1.8u l=0.18u
mny0c  xy02  g3n   xy03  vss!  nsh  w=1.8u l=0.18u
mny0d  xy03  g1n   vss!  vss!  nsh  w=1.8u l=0.18u
mpy0a  z0    g7n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy0b  z0    g5n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy0c  z0    g3n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy0d  z0    g1n   vdd!  vdd!  psh  w=1.2u l=0.18u
mny1a  z1    g7n   xy11  vss!  nsh  w=1.8u l=0.18u
mny1b  xy11  g6n   xy12  vss!  nsh  w=1.8u l=0.18u
mny1c  xy12  g3n   xy13  vss!  nsh  w=1.8u l=0.18u
mny1d  xy13  g2n   vss!  vss!  nsh  w=1.8u l=0.18u
mpy1a  z1    g7n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy1b  z1    g6n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy1c  z1    g3n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy1d  z1    g2n   vdd!  vdd!  psh  w=1.2u l=0.18u
mny2a  z2    g7n   xy21  vss!  nsh  w=1.8u l=0.18u
mny2b  xy21  g6n   xy22  vss!  nsh  w=1.8u l=0.18u
mny2c  xy22  g5n   xy23  vss!  nsh  w=1.8u l=0.18u
mny2d  xy23  g4n   vss!  vss!  nsh  w=1.8u l=0.18u
mpy2a  z2    g7n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy2b  z2    g6n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy2c  z2    g5n   vdd!  vdd!  psh  w=1.2u l=0.18u
mpy2d  z2    g4n   vdd!  vdd!  psh  w=1.2u l=0.18u

* two inverters drive each index bit across the block
mno0a  z0n   z0    vss!  vss!  nsh  w=0.7U l=0.18U
mpo0a  z0n   z0    vdd!  vdd!  psh  w=1.5U l=0.18U
mno0b  y0    z0n   vss!  vss!  nsh  w=2.4U l=0.18U
+      ad=1.01p as=1.01p pd=3.24u ps=3.24u
mpo0b  y0    z0n   vdd!  vdd!  psh  w=5.2U l=0.18U
+      ad=2.18p as=2.18p pd=6.04u ps=6.04u
mno1a  z1n   z1    vss!  vss!  nsh  w=0.7U l=0.18U
mpo1a  z1n   z1    vdd!  vdd!  psh  w=1.5U l=0.18U
mno1b  y1    z1n   vss!  vss!  nsh  w=2.4U l=0.18U
+      ad=1.01p as=1.01p pd=3.24u ps=3.24u
mpo1b  y1    z1n   vdd!  vdd!  psh  w=5.2U l=0.18U
+      ad=2.18p as=2.18p pd=6.04u ps=6.04u
mno2a  z2n   z2    vss!  vss!  nsh  w=0.7U l=0.18U
mpo2a  z2n   z2    vdd!  vdd!  psh  w=1.5U l=0.18U
mno2b  y2    z2n   vss!  vss!  nsh  w=2.4U l=0.18U
+      ad=1.01p as=1.01p pd=3.24u ps=3.24u
mpo2b  y2    z2n   vdd!  vdd!  psh  w=5.2U l=0.18U
+      ad=2.18p as=2.18p pd=6.04u ps=6.04u

* wires the extraction found worth telling
ck3 k3n 0 2.2f
ck5 k5n 0 2.4f
cg7 g7n 0 3.1f      $ across to all three index gates
.end
