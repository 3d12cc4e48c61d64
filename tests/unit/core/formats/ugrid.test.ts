import { NetCDFReader } from 'netcdfjs';
import { describe, expect, it } from 'vitest';

import { runRecipe } from '#core/design/run-recipe.ts';
import { assembleMatrices } from '#core/fem/assembly.ts';
import type { MeshProvenance } from '#core/formats/ugrid.ts';
import { writeUgrid } from '#core/formats/ugrid.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';
import { columnsOf, recipeOf, seeded } from '#support/meshes.ts';

const provenance: MeshProvenance = {
  title: 'A mesh',
  source: 'Selvage 0',
  history: '2026-01-01T00:00:00.000Z: saved',
  meshSha256: 'aa',
  observationSha256: 'bb',
  recipe: '{}',
  correlation: '{}',
  caution: 'be careful',
};

const made = (crs: CoordinateReference, errorSd?: Float64Array) => {
  const random = seeded(11);
  const points = Array.from({ length: 40 }, (): [number, number] => (crs === 'lonlat-deg' ? [178 + 6 * random(), 50 + 4 * random()] : [300 * random(), 300 * random()]));
  for (const point of points) if (crs === 'lonlat-deg' && point[0] >= 180) point[0] -= 360;
  points.push(points[7]);
  const { mesh, selected } = runRecipe({ ...columnsOf(crs, points), ...(errorSd && { errorSd }) }, recipeOf({ bufferKm: 150 }), { sphereRadiusKm: 6371 });
  const { lumpedMass } = assembleMatrices(mesh);
  const bytes = writeUgrid(mesh, selected, lumpedMass, provenance);
  return { mesh, selected, lumpedMass, bytes, reader: new NetCDFReader(bytes) };
};

const attributesOf = (reader: NetCDFReader, name: string): Record<string, unknown> =>
  Object.fromEntries((reader.variables.find((variable) => variable.name === name)!.attributes as { name: string; value: unknown }[]).map((attribute) => [attribute.name, attribute.value]));

describe('writeUgrid', () => {
  const sphere = made('lonlat-deg');
  const plane = made('plane-km');

  it.each([['sphere', sphere], ['plane', plane]])('gives nodes, elements and the observation map back exactly (%s)', (_name, { mesh, selected, lumpedMass, reader }) => {
    const isSphere = mesh.crs === 'lonlat-deg';
    const data = (name: string) => reader.getDataVariable(name) as number[];
    const [x, y] = isSphere ? [data('node_lon'), data('node_lat')] : [data('node_x'), data('node_y')];
    expect(x.flatMap((value, i) => [value, y[i]])).toEqual([...mesh.coordinates]);
    expect(data('face_nodes')).toEqual([...mesh.triangles]);
    // this reader gives the padding of a byte variable along with it
    expect((reader.getDataVariable('node_kind') as unknown as Uint8Array[]).slice(0, x.length).map(([kind]) => kind)).toEqual([...mesh.nodeKind]);
    expect(data('node_observation')).toEqual([...mesh.nodeObservation]);
    expect(data('lumped_mass')).toEqual([...lumpedMass]);
    expect(data(isSphere ? 'observation_lon' : 'observation_x')).toEqual([...selected.x]);
    // the node of an observation lies where the observation lies
    for (const [i, node] of data('observation_node').entries()) expect([x[node], y[node]]).toEqual([selected.x[i], selected.y[i]]);
    // 41 rows, two of them at one place
    expect(data('observation_row_count').reduce((sum, count) => sum + count, 0)).toBe(41);
    expect(data('observation_node')).toHaveLength(40);
  });

  it('lists each boundary edge once: the edges that one element has', () => {
    const { mesh, reader } = sphere;
    const count = new Map<string, number>();
    for (let t = 0; t < mesh.triangles.length; t += 3)
      for (let k = 0; k < 3; k++) {
        const edge = [mesh.triangles[t + k], mesh.triangles[t + ((k + 1) % 3)]];
        const key = [...edge].sort((a, b) => a - b).join();
        count.set(key, (count.get(key) ?? 0) + 1);
      }
    const single = [...count].filter(([, n]) => n === 1).map(([key]) => key);
    const flat = reader.getDataVariable('boundary_nodes') as number[];
    const written = Array.from({ length: flat.length / 2 }, (_, k) => [flat[2 * k], flat[2 * k + 1]].sort((a, b) => a - b).join());
    expect(written.sort()).toEqual(single.sort());
    expect(new Set(reader.getDataVariable('boundary_loop'))).toEqual(new Set([0]));
  });

  // UGRID Conventions 1.0, "2D triangular mesh topology"; CF Conventions 1.11, sections 4.1, 4.2, 5.6 and 5.9
  it('has the attributes that UGRID 1.0 and CF 1.11 require', () => {
    const { reader } = sphere;
    expect(reader.getAttribute('Conventions')).toBe('CF-1.11 UGRID-1.0');
    const topology = attributesOf(reader, 'mesh');
    expect(topology).toMatchObject({ cf_role: 'mesh_topology', topology_dimension: 2, node_coordinates: 'node_lon node_lat', face_node_connectivity: 'face_nodes' });
    expect(attributesOf(reader, 'face_nodes')).toMatchObject({ cf_role: 'face_node_connectivity', start_index: 0 });
    expect(attributesOf(reader, 'node_lon')).toMatchObject({ standard_name: 'longitude', units: 'degrees_east' });
    expect(attributesOf(reader, 'node_lat')).toMatchObject({ standard_name: 'latitude', units: 'degrees_north' });
    expect(attributesOf(reader, 'crs')).toMatchObject({ grid_mapping_name: 'latitude_longitude', earth_radius: 6371000 });
    expect(attributesOf(reader, 'node_observation')).toMatchObject({ mesh: 'mesh', location: 'node', coordinates: 'node_lon node_lat', grid_mapping: 'crs', _FillValue: -1 });
    const kind = attributesOf(reader, 'node_kind');
    expect((kind['flag_meanings'] as string).split(' ')).toHaveLength((kind['flag_values'] as number[]).length);
    expect(reader.variables.find(({ name }) => name === 'face_nodes')!.type).toBe('int');
  });

  it('refers only to variables and dimensions that are there, in the plane without a grid mapping', () => {
    for (const { reader } of [sphere, plane]) {
      const names = reader.variables.map(({ name }) => name);
      for (const { name } of reader.variables) {
        const a = attributesOf(reader, name) as Record<string, string | undefined>;
        for (const key of ['node_coordinates', 'face_node_connectivity', 'boundary_node_connectivity', 'coordinates', 'grid_mapping', 'mesh'])
          for (const target of a[key]?.split(' ') ?? []) expect(names, `${name}:${key}`).toContain(target);
      }
    }
    expect(plane.reader.variables.map(({ name }) => name)).not.toContain('crs');
    expect(attributesOf(plane.reader, 'node_x')).toMatchObject({ standard_name: 'projection_x_coordinate', units: 'km' });
  });

  it('says where the mesh comes from, its hash, its index base and the caution', () => {
    const { reader } = sphere;
    expect(reader.getAttribute('mesh_sha256')).toBe('aa');
    expect(reader.getAttribute('observation_file_sha256')).toBe('bb');
    expect(reader.getAttribute('index_base')).toBe(0);
    expect(reader.getAttribute('comment')).toBe('be careful');
    expect(reader.getAttribute('history')).toBe(provenance.history);
  });

  it('keeps error standard deviations, combined ones by inverse variance, and NaN where none is given', () => {
    const sd = new Float64Array(41).fill(0.5);
    sd[3] = NaN;
    const { mesh, reader, selected } = made('plane-km', sd);
    const written = reader.getDataVariable('observation_error_sd') as number[];
    expect(Float64Array.from(written)).toEqual(selected.errorSd);
    expect(written.filter(Number.isNaN)).toHaveLength(1);
    // two of 0.5 at one place: 1 / sqrt(1/0.25 + 1/0.25)
    const pair = (reader.getDataVariable('observation_row_count') as number[]).indexOf(2);
    expect(written[pair]).toBeCloseTo(Math.sqrt(1 / 8), 14);
    expect(attributesOf(reader, 'observation_error_sd')['_FillValue']).toBeNaN();
    expect(mesh.observationNode).toHaveLength(written.length);
  });

  it('gives the same bytes for the same mesh', () => {
    expect(made('lonlat-deg').bytes).toEqual(sphere.bytes);
  });
});
