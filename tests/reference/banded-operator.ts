/**
 * An independent finite-element calculation for the tests of the boundary effect: element matrices from the gradients
 * of the shape functions, Cholesky dense within the band, and C_m = A^-1 (M A^-1)^(m-1) column by column.
 */

/** Plane triangulation; nodes numbered so that neighbours lie within a narrow band. Lengths in diffusion scales. */
export interface PlaneMesh {
  x: number[];
  y: number[];
  triangles: [number, number, number][];
}

export interface BandedOperator {
  /** Column `node` of C_m. */
  column(node: number, m: number): Float64Array;
}

/** Factors A = M + K (l = 1) of a mesh. */
export function bandedOperator(mesh: PlaneMesh): BandedOperator {
  const n = mesh.x.length;
  let band = 0;
  for (const [a, b, c] of mesh.triangles) band = Math.max(band, Math.abs(a - b), Math.abs(b - c), Math.abs(c - a));
  const w = band + 1;
  // row i holds columns i - band .. i
  const l = new Float64Array(n * w);
  const mass = new Float64Array(n * w);
  for (const t of mesh.triangles) {
    const [a, b, c] = t;
    const jacobian = (mesh.x[b] - mesh.x[a]) * (mesh.y[c] - mesh.y[a]) - (mesh.x[c] - mesh.x[a]) * (mesh.y[b] - mesh.y[a]);
    const area = jacobian / 2;
    const gx = [mesh.y[b] - mesh.y[c], mesh.y[c] - mesh.y[a], mesh.y[a] - mesh.y[b]].map((v) => v / jacobian);
    const gy = [mesh.x[c] - mesh.x[b], mesh.x[a] - mesh.x[c], mesh.x[b] - mesh.x[a]].map((v) => v / jacobian);
    for (let i = 0; i < 3; i++)
      for (let j = 0; j < 3; j++) {
        if (t[j] > t[i]) continue;
        const at = t[i] * w + band - (t[i] - t[j]);
        const mij = (area / 12) * (i === j ? 2 : 1);
        mass[at] += mij;
        l[at] += mij + area * (gx[i] * gx[j] + gy[i] * gy[j]);
      }
  }
  for (let i = 0; i < n; i++) {
    const first = Math.max(0, i - band);
    for (let j = first; j <= i; j++) {
      let sum = l[i * w + band - (i - j)];
      const from = Math.max(first, j - band);
      for (let k = from, p = i * w + band - (i - from), q = j * w + band - (j - from); k < j; k++, p++, q++) sum -= l[p] * l[q];
      l[i * w + band - (i - j)] = i === j ? Math.sqrt(sum) : sum / l[j * w + band];
    }
  }
  const solve = (x: Float64Array) => {
    for (let i = 0; i < n; i++) {
      let sum = x[i];
      for (let j = Math.max(0, i - band), p = i * w + band - (i - j); j < i; j++, p++) sum -= l[p] * x[j];
      x[i] = sum / l[i * w + band];
    }
    for (let i = n - 1; i >= 0; i--) {
      x[i] /= l[i * w + band];
      for (let j = Math.max(0, i - band), p = i * w + band - (i - j); j < i; j++, p++) x[j] -= l[p] * x[i];
    }
  };
  const multiplyMass = (x: Float64Array) => {
    const out = new Float64Array(n);
    for (let i = 0; i < n; i++) {
      for (let j = Math.max(0, i - band), p = i * w + band - (i - j); j < i; j++, p++) {
        out[i] += mass[p] * x[j];
        out[j] += mass[p] * x[i];
      }
      out[i] += mass[i * w + band] * x[i];
    }
    return out;
  };
  return {
    column(node, m) {
      let x = new Float64Array(n);
      x[node] = 1;
      solve(x);
      for (let k = 1; k < m; k++) {
        x = multiplyMass(x) as Float64Array<ArrayBuffer>;
        solve(x);
      }
      return x;
    },
  };
}
