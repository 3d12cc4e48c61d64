/**
 * Matrices of one linear (P1) triangle with vertices in three dimensions (Strang & Fix 1973; Zienkiewicz, Taylor & Zhu
 * 2013). A triangle with its vertices on the sphere is the flat one through them.
 */

/**
 * Writes the stiffness matrix of the triangle a, b, c into `out` as K_ab, K_bc, K_ca (its off-diagonals) and the area
 * into `out[3]`. K_ij = -cot(opposite angle)/2 = -(e_i . e_j)-like products over 4 area: K_ab = (b-c).(c-a) / (4 area).
 */
export function p1Stiffness(
  ax: number, ay: number, az: number,
  bx: number, by: number, bz: number,
  cx: number, cy: number, cz: number,
  out: Float64Array,
): void {
  // sides opposite to a, b, c
  const ux = cx - bx, uy = cy - by, uz = cz - bz;
  const vx = ax - cx, vy = ay - cy, vz = az - cz;
  const wx = bx - ax, wy = by - ay, wz = bz - az;
  const nx = uy * vz - uz * vy, ny = uz * vx - ux * vz, nz = ux * vy - uy * vx;
  const doubleArea = Math.sqrt(nx * nx + ny * ny + nz * nz);
  const scale = 1 / (2 * doubleArea);
  out[0] = (ux * vx + uy * vy + uz * vz) * scale;
  out[1] = (vx * wx + vy * wy + vz * wz) * scale;
  out[2] = (wx * ux + wy * uy + wz * uz) * scale;
  out[3] = doubleArea / 2;
}
