import { execFileSync } from 'node:child_process';
import { existsSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';

import { strFromU8, unzipSync } from 'fflate';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';

import { runRecipe } from '#core/design/run-recipe.ts';
import { assembleMatrices } from '#core/fem/assembly.ts';
import { packMesh } from '#core/formats/mesh-bundle.ts';
import { columnsOf, recipeOf, seeded } from '#support/meshes.ts';
import { makeExports } from '#worker/numerics/make-exports.ts';

// Debian's netcdf-bin, python3-netcdf4 and python3-scipy: readers by other hands than ours
const PYTHON = '/usr/bin/python3';
const has = (command: string, args: string[]): boolean => {
  try {
    execFileSync(command, args, { stdio: 'ignore' });
    return true;
  } catch {
    return false;
  }
};
const hasNcdump = existsSync('/usr/bin/ncdump');
const hasPython = has(PYTHON, ['-c', 'import netCDF4, scipy.io']);

const random = seeded(5);
const points = Array.from({ length: 400 }, (): [number, number] => [((10 * random() + 176 + 180) % 360) - 180, 40 + 8 * random()]);
const { mesh, selected } = runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 200 }), { sphereRadiusKm: 6371 });
const matrices = assembleMatrices(mesh);
const facts = {
  meshHash: '0'.repeat(64),
  number: 3,
  designName: 'Résumé of a mesh',
  savedAt: '2026-01-02T03:04:05.678Z',
  softwareVersion: 'Selvage 0.1.0',
  observationSha256: '1'.repeat(64),
  recipe: { note: 'flag “good”' },
  correlation: {},
};
const { exports } = makeExports({ kind: 'make-exports', arrays: packMesh({ mesh, selected }), facts }, { report: () => undefined, sendBatch: async () => undefined });

describe('exports in independent readers', () => {
  let folder = '';
  const fileOf = (name: string): string => path.join(folder, name);
  beforeAll(() => {
    folder = mkdtempSync(path.join(tmpdir(), 'selvage-exports-'));
    for (const { format, bytes } of exports) writeFileSync(fileOf(format), bytes);
    const archive = unzipSync(exports.find(({ format }) => format === 'matrix-market')!.bytes);
    for (const [name, bytes] of Object.entries(archive)) writeFileSync(fileOf(name), strFromU8(bytes));
  });
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  it.skipIf(!hasNcdump)('ncdump reads the NetCDF file: kind, dimensions, text in UTF-8', () => {
    expect(execFileSync('ncdump', ['-k', fileOf('netcdf')]).toString().trim()).toBe('64-bit offset');
    const header = execFileSync('ncdump', ['-h', fileOf('netcdf')]).toString();
    expect(header).toContain(`node = ${mesh.nodeKind.length} ;`);
    expect(header).toContain(`face = ${mesh.triangles.length / 3} ;`);
    expect(header).toContain(':title = "Résumé of a mesh, version 3" ;');
    expect(header).toContain('node_observation:_FillValue = -1 ;');
  });

  it.skipIf(!hasPython)('netCDF4-python gives the same numbers to the last bit, and masks nodes without an observation', () => {
    const program = `
import json, sys, netCDF4
d = netCDF4.Dataset(sys.argv[1])
v = d.variables
o = v['node_observation'][:]
print(json.dumps({
  'lon': [x.hex() for x in v['node_lon'][:].tolist()], 'lat': [x.hex() for x in v['node_lat'][:].tolist()],
  'faces': v['face_nodes'][:].tolist(), 'mass': [x.hex() for x in v['lumped_mass'][:].tolist()],
  'kind': v['node_kind'][:].tolist(), 'masked': int(o.mask.sum()), 'area': float(v['face_area'][:].sum()),
}))`;
    const read = JSON.parse(execFileSync(PYTHON, ['-c', program, fileOf('netcdf')], { maxBuffer: 1e9 }).toString()) as Record<string, any>;
    const parse = (list: string[]): number[] => JSON.parse(execFileSync(PYTHON, ['-c', 'import json, sys; print(json.dumps([float.fromhex(x) for x in json.load(sys.stdin)]))'], { input: JSON.stringify(list), maxBuffer: 1e9 }).toString()) as number[];
    const lon = parse(read['lon']);
    const lat = parse(read['lat']);
    expect(lon.flatMap((value, i) => [value, lat[i]])).toEqual([...mesh.coordinates]);
    expect(read['faces'].flat()).toEqual([...mesh.triangles]);
    expect(parse(read['mass'])).toEqual([...matrices.lumpedMass]);
    expect(read['kind']).toEqual([...mesh.nodeKind]);
    expect(read['masked']).toBe(mesh.nodeObservation.filter((observation) => observation < 0).length);
    expect(read['area'] / matrices.lumpedMass.reduce((sum, value) => sum + value, 0)).toBeCloseTo(1, 12);
  });

  it.skipIf(!hasPython)('scipy reads M and K whole: symmetric, total and row sums as assembled, K semidefinite', () => {
    const program = `
import json, sys, numpy, scipy.io
m, k, l = (scipy.io.mmread(f).tocsr() for f in sys.argv[1:])
one = numpy.ones(m.shape[0])
print(json.dumps({
  'shape': m.shape, 'asymmetry': [abs(a - a.T).max() for a in (m, k)], 'total': float(one @ (m @ one)),
  'rows': float(abs(k @ one).max()), 'lumped': float(abs(m @ one - l.diagonal()).max() / l.diagonal().max()),
  'm': [[int(i), int(j), float(v).hex()] for i, j, v in zip(*(lambda c: (c.row, c.col, c.data))(m.tocoo()))],
  'least': float(numpy.linalg.eigvalsh(k.toarray())[0]) if m.shape[0] < 3000 else None,
}))`;
    const read = JSON.parse(execFileSync(PYTHON, ['-c', program, ...['mass', 'stiffness', 'lumped-mass'].map((name) => fileOf(`${name}.mtx`))], { maxBuffer: 1e9 }).toString()) as Record<string, any>;
    const n = mesh.nodeKind.length;
    expect(read['shape']).toEqual([n, n]);
    expect(read['asymmetry']).toEqual([0, 0]);
    expect(read['total'] / matrices.lumpedMass.reduce((sum, value) => sum + value, 0)).toBeCloseTo(1, 12);
    expect(read['rows']).toBeLessThan(1e-12);
    expect(read['lumped']).toBeLessThan(1e-14);
    expect(read['m']).toHaveLength(matrices.mass.values.length);
    if (read['least'] !== null) expect(read['least']).toBeGreaterThan(-1e-10);
  }, 120_000);
});
