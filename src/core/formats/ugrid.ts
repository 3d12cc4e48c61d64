import type { DesignedMesh, SelectedObservations } from '#core/design/designed-mesh.ts';
import { elementQuality } from '#core/geometry/quality.ts';

import type { NetcdfAttribute, NetcdfVariable } from './netcdf-classic.ts';
import { writeNetcdf } from './netcdf-classic.ts';

/** What a file says of where its mesh comes from. */
export interface MeshProvenance {
  title: string;
  /** Program and version. */
  source: string;
  /** ISO 8601, with what happened then. */
  history: string;
  meshSha256: string;
  observationSha256: string;
  recipe: string;
  correlation: string;
  caution: string;
}

const int = (...values: number[]): NetcdfAttribute => ({ int: values });
const double = (...values: number[]): NetcdfAttribute => ({ double: values });

/**
 * A designed mesh as NetCDF with UGRID-1.0 topology and CF-1.11 attributes. All indices count from 0 (`start_index`).
 * On the sphere coordinates are degrees and areas those of the flat elements; distances in km throughout.
 */
export const writeUgrid = (mesh: DesignedMesh, selected: SelectedObservations, lumpedMass: Float64Array, provenance: MeshProvenance): Uint8Array => {
  const nodes = mesh.nodeKind.length;
  const faces = mesh.triangles.length / 3;
  const isSphere = mesh.crs === 'lonlat-deg';
  const [x, y] = isSphere ? ['node_lon', 'node_lat'] : ['node_x', 'node_y'];
  const [ox, oy] = isSphere ? ['observation_lon', 'observation_lat'] : ['observation_x', 'observation_y'];
  const coordinates = `${x} ${y}`;
  // in the plane the projection is the observation set's own and not known here: CF then has no grid mapping
  const onGrid: Record<string, NetcdfAttribute> = isSphere ? { grid_mapping: 'crs' } : {};
  const onNode = { mesh: 'mesh', location: 'node', coordinates, ...onGrid };
  const onObservation = { coordinates: `${ox} ${oy}`, ...onGrid };
  const edges = boundaryEdges(mesh.boundaryLoops);

  const axis = (k: 0 | 1): Record<string, NetcdfAttribute> =>
    isSphere
      ? { standard_name: k === 0 ? 'longitude' : 'latitude', units: k === 0 ? 'degrees_east' : 'degrees_north' }
      : { standard_name: k === 0 ? 'projection_x_coordinate' : 'projection_y_coordinate', units: 'km' };
  const coordinate = (k: 0 | 1): Float64Array => Float64Array.from({ length: nodes }, (_, i) => mesh.coordinates[2 * i + k]);

  const variables: NetcdfVariable[] = [
    {
      name: 'mesh',
      dimensions: [],
      data: Int32Array.of(0),
      attributes: {
        cf_role: 'mesh_topology',
        long_name: 'triangulation of the observation locations and their buffer',
        topology_dimension: int(2),
        node_coordinates: coordinates,
        face_node_connectivity: 'face_nodes',
        face_dimension: 'face',
        boundary_node_connectivity: 'boundary_nodes',
      },
    },
    ...(isSphere
      ? [
          {
            name: 'crs',
            dimensions: [],
            data: Int32Array.of(0),
            attributes: { grid_mapping_name: 'latitude_longitude', earth_radius: double(1000 * mesh.radiusKm), long_name: 'sphere; earth_radius in metres' },
          },
        ]
      : []),
    { name: x, dimensions: ['node'], data: coordinate(0), attributes: { ...axis(0), long_name: `${isSphere ? 'longitude' : 'x'} of nodes` } },
    { name: y, dimensions: ['node'], data: coordinate(1), attributes: { ...axis(1), long_name: `${isSphere ? 'latitude' : 'y'} of nodes` } },
    {
      name: 'face_nodes',
      dimensions: ['face', 'three'],
      data: Int32Array.from(mesh.triangles),
      attributes: { cf_role: 'face_node_connectivity', long_name: 'nodes of each element, counter-clockwise', start_index: int(0) },
    },
    {
      name: 'boundary_nodes',
      dimensions: ['boundary_edge', 'two'],
      data: edges,
      attributes: { cf_role: 'boundary_node_connectivity', long_name: 'nodes of each boundary edge, the domain on its left', start_index: int(0) },
    },
    {
      name: 'boundary_loop',
      dimensions: ['boundary_edge'],
      data: Int32Array.from(mesh.boundaryLoops.flatMap((loop, k) => Array<number>(loop.length).fill(k))),
      attributes: { long_name: 'boundary loop of each boundary edge, from 0; the first is an outer boundary' },
    },
    {
      name: 'boundary_curvature',
      dimensions: ['boundary_edge'],
      data: mesh.boundaryCurvature,
      attributes: { long_name: 'curvature of the boundary, positive where it bulges out of the domain', units: 'km-1' },
    },
    {
      name: 'node_kind',
      dimensions: ['node'],
      data: mesh.nodeKind,
      attributes: {
        ...onNode,
        long_name: 'what the node is',
        flag_values: { byte: [0, 1, 2, 3, 4] },
        flag_meanings: 'observation core_filler buffer_filler outer_boundary hole_boundary',
      },
    },
    {
      name: 'node_observation',
      dimensions: ['node'],
      data: mesh.nodeObservation,
      attributes: { ...onNode, long_name: 'observation at the node, counted from 0', _FillValue: int(-1) },
    },
    {
      name: 'lumped_mass',
      dimensions: ['node'],
      data: lumpedMass,
      attributes: { ...onNode, long_name: 'row sum of the mass matrix: a third of the area of the elements at the node', units: 'km2' },
    },
    {
      name: 'face_area',
      dimensions: ['face'],
      data: elementQuality(mesh).areaKm2,
      attributes: { mesh: 'mesh', location: 'face', ...onGrid, long_name: 'area of the flat element', standard_name: 'cell_area', units: 'km2' },
    },
    {
      name: 'observation_node',
      dimensions: ['observation'],
      data: Int32Array.from(mesh.observationNode),
      attributes: { long_name: 'node of each observation, counted from 0', ...onObservation },
    },
    { name: ox, dimensions: ['observation'], data: selected.x, attributes: { ...axis(0), long_name: `${isSphere ? 'longitude' : 'x'} of observations` } },
    { name: oy, dimensions: ['observation'], data: selected.y, attributes: { ...axis(1), long_name: `${isSphere ? 'latitude' : 'y'} of observations` } },
    {
      name: 'observation_row_count',
      dimensions: ['observation'],
      data: Int32Array.from(selected.x, (_, i) => selected.rowStart[i + 1] - selected.rowStart[i]),
      attributes: { long_name: 'rows of the observation set that were combined into the observation', ...onObservation },
    },
  ];
  if (selected.errorSd)
    variables.push({
      name: 'observation_error_sd',
      dimensions: ['observation'],
      data: selected.errorSd,
      attributes: { long_name: 'observation error standard deviation, in the unit of the observations; NaN where not given', ...onObservation, _FillValue: double(NaN) },
    });
  return writeNetcdf({
    dimensions: { node: nodes, face: faces, boundary_edge: edges.length / 2, observation: selected.x.length, two: 2, three: 3 },
    attributes: {
      Conventions: 'CF-1.11 UGRID-1.0',
      title: provenance.title,
      source: provenance.source,
      history: provenance.history,
      comment: provenance.caution,
      mesh_sha256: provenance.meshSha256,
      observation_file_sha256: provenance.observationSha256,
      index_base: int(0),
      recipe: provenance.recipe,
      correlation: provenance.correlation,
    },
    variables,
  });
};

const boundaryEdges = (loops: Uint32Array[]): Int32Array => Int32Array.from(loops.flatMap((loop) => [...loop].flatMap((node, k) => [node, loop[(k + 1) % loop.length]])));
