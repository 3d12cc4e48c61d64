import type { DesignedMesh, OutlineCorner, SelectedObservations } from '#core/design/designed-mesh.ts';
import { NumericalError } from '#core/errors.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';

import type { TypedArray } from './array-bundle.ts';
import { packArrays, unpackArrays } from './array-bundle.ts';

interface Meta {
  kind: 'mesh';
  crs: CoordinateReference;
  radiusKm: number;
  coreSpacingKm: number;
  outlineCorners: OutlineCorner[];
}

/** A designed mesh and its observations, as stored with a version and sent to the browser. */
export interface MeshBundle {
  mesh: DesignedMesh;
  selected: SelectedObservations;
}

/** Offsets of the lists when laid end to end: n + 1 of them. */
const offsetsOf = (lists: ArrayLike<unknown>[]): Uint32Array => {
  const offsets = new Uint32Array(lists.length + 1);
  for (let k = 0; k < lists.length; k++) offsets[k + 1] = offsets[k] + lists[k].length;
  return offsets;
};

/** Mesh and observations as one array bundle: little-endian, the same bytes for the same mesh. */
export const packMesh = ({ mesh, selected }: MeshBundle): Uint8Array => {
  const meta: Meta = { kind: 'mesh', crs: mesh.crs, radiusKm: mesh.radiusKm, coreSpacingKm: mesh.coreSpacingKm, outlineCorners: mesh.outlineCorners };
  const arrays: Record<string, TypedArray> = {
    coordinates: mesh.coordinates,
    triangles: mesh.triangles,
    nodeKind: mesh.nodeKind,
    nodeObservation: mesh.nodeObservation,
    observationNode: mesh.observationNode,
    boundaryStart: offsetsOf(mesh.boundaryLoops),
    boundaryNodes: Uint32Array.from(mesh.boundaryLoops.flatMap((loop) => [...loop])),
    boundaryCurvature: mesh.boundaryCurvature,
    outlineStart: offsetsOf(mesh.outline),
    outlineCoordinates: Float64Array.from(mesh.outline.flatMap((ring) => [...ring])),
    localSpacingKm: mesh.localSpacingKm,
    observationX: selected.x,
    observationY: selected.y,
    rowStart: selected.rowStart,
    rows: selected.rows,
    exclusion: selected.exclusion,
  };
  for (const name of ['value', 'value2', 'errorSd'] as const) {
    const column = selected[name];
    if (column) arrays[name] = column;
  }
  return packArrays(meta, arrays);
};

const cut = <T extends Uint32Array | Float64Array>(flat: T, offsets: Uint32Array): T[] =>
  Array.from({ length: offsets.length - 1 }, (_, k) => flat.slice(offsets[k], offsets[k + 1]) as T);

/** What `packMesh` packed. @throws NumericalError FILE_MALFORMED */
export const unpackMesh = (bytes: Uint8Array): MeshBundle => {
  const { meta, arrays } = unpackArrays(bytes);
  const { kind, crs, radiusKm, coreSpacingKm, outlineCorners } = (meta ?? {}) as Meta;
  if (kind !== 'mesh') throw new NumericalError('FILE_MALFORMED', 'These bytes are not a mesh of Selvage. Fetch the mesh again.', { details: { kind } });
  const f = (name: string): Float64Array => arrays[name] as Float64Array;
  const u = (name: string): Uint32Array => arrays[name] as Uint32Array;
  return {
    mesh: {
      crs,
      radiusKm,
      coordinates: f('coordinates'),
      triangles: u('triangles'),
      nodeKind: arrays['nodeKind'] as Uint8Array,
      nodeObservation: arrays['nodeObservation'] as Int32Array,
      observationNode: u('observationNode'),
      boundaryLoops: cut(u('boundaryNodes'), u('boundaryStart')),
      boundaryCurvature: f('boundaryCurvature'),
      outline: cut(f('outlineCoordinates'), u('outlineStart')),
      outlineCorners,
      localSpacingKm: f('localSpacingKm'),
      coreSpacingKm,
    },
    selected: {
      crs,
      x: f('observationX'),
      y: f('observationY'),
      ...(arrays['value'] && { value: f('value') }),
      ...(arrays['value2'] && { value2: f('value2') }),
      ...(arrays['errorSd'] && { errorSd: f('errorSd') }),
      rowStart: u('rowStart'),
      rows: u('rows'),
      exclusion: arrays['exclusion'] as Uint8Array,
    },
  };
};
