import type { CheckedMesh } from '#core/findings/checked-mesh.ts';
import { z } from 'zod/v4';

import { parseValue } from '#server/respond.ts';

const meshDocumentSchema = z.object({
  crs: z.enum(['plane-km', 'lonlat-deg']),
  radiusKm: z.number().positive().optional(),
  nodes: z.array(z.tuple([z.number(), z.number()])).min(3),
  triangles: z.array(z.tuple([z.int().min(0), z.int().min(0), z.int().min(0)])).min(1),
  nodeKind: z.array(z.int().min(0).max(4)).optional(),
  observationNode: z.array(z.int().min(0)).optional(),
});

/** A mesh document as a mesh to check; `radiusKm` where the document gives none. @throws AppError VALIDATION_FAILED naming the entry */
export const readMeshDocument = (value: unknown, radiusKm: number): CheckedMesh => {
  const document = parseValue(meshDocumentSchema, value);
  return {
    crs: document.crs,
    radiusKm: document.crs === 'lonlat-deg' ? (document.radiusKm ?? radiusKm) : 0,
    coordinates: Float64Array.from(document.nodes.flat()),
    triangles: Uint32Array.from(document.triangles.flat()),
    ...(document.nodeKind?.length === document.nodes.length && { nodeKind: Uint8Array.from(document.nodeKind) }),
    ...(document.observationNode && { observationNode: Uint32Array.from(document.observationNode) }),
  };
};
