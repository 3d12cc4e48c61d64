import type { Mesh } from './mesh.ts';
import { elementCount, nodeCount } from './mesh.ts';

/**
 * The bytes that a mesh's content hash is taken over, the same on every machine: 8 bytes `SLVMESH1`, coordinate
 * reference as u32 (0 longitude/latitude in degrees, 1 plane in km), nodes and elements as u32, 4 zero bytes, the
 * sphere's radius as f64 (0 in the plane), all coordinates as f64, all triangles as u32; little-endian throughout.
 */
export const meshBytes = (mesh: Mesh): Uint8Array => {
  const nodes = nodeCount(mesh);
  const elements = elementCount(mesh);
  const bytes = new Uint8Array(32 + 16 * nodes + 12 * elements);
  const view = new DataView(bytes.buffer);
  for (const [k, letter] of [...'SLVMESH1'].entries()) bytes[k] = letter.charCodeAt(0);
  view.setUint32(8, mesh.crs === 'lonlat-deg' ? 0 : 1, true);
  view.setUint32(12, nodes, true);
  view.setUint32(16, elements, true);
  view.setFloat64(24, mesh.crs === 'lonlat-deg' ? mesh.radiusKm : 0, true);
  let at = 32;
  for (let k = 0; k < 2 * nodes; k++, at += 8) view.setFloat64(at, mesh.coordinates[k], true);
  for (let k = 0; k < 3 * elements; k++, at += 4) view.setUint32(at, mesh.triangles[k], true);
  return bytes;
};
