import { z } from 'zod/v4';

import { createDesignSchema, designSchema, updateDesignSchema } from '#schemas/designs.ts';
import { checkResultSchema, findingSchema } from '#schemas/findings.ts';
import { jobSchema } from '#schemas/jobs.ts';
import { listOf, listQuerySchema } from '#schemas/list.ts';
import { observationSetSchema, pointsPageSchema, pointsQuerySchema, rejectedQuerySchema, rejectedRowSchema } from '#schemas/observation-sets.ts';
import {
  addedMemberSchema,
  addMemberSchema,
  changePasswordSchema,
  changeRoleSchema,
  createTeamSchema,
  memberSchema,
  meSchema,
  signInSchema,
  teamSchema,
} from '#schemas/people.ts';
import { createStudySchema, studySchema, updateStudySchema } from '#schemas/studies.ts';
import { exportSchema, saveVersionSchema, versionSchema, versionSummarySchema } from '#schemas/versions.ts';

import type { Action } from '../policies.ts';

export type Method = 'GET' | 'POST' | 'PUT' | 'PATCH' | 'DELETE';

/** One method of one address: what the document says of it, and what tests hold the endpoints to. */
export interface Route {
  method: Method;
  /** Below /api/v1, with parameters as `{studyId}`. */
  path: string;
  /** Name of the service behind it. */
  operation: string;
  summary: string;
  /** Who may: everybody, whoever is signed in, or whose role in the row's team allows the action. */
  access: 'everybody' | 'signed-in' | Action;
  query?: z.ZodObject;
  body?: z.ZodType;
  /** The body is a multipart form with the part `file`. */
  isUpload?: true;
  status: 200 | 201 | 202 | 204;
  /** Shape of a JSON answer. */
  answer?: z.ZodType;
  /** Media types of an answer that is not (only) JSON. */
  media?: string[];
}

const list = listQuerySchema;
const binary = ['application/octet-stream'];

/** Every endpoint of the interface. */
export const ROUTES: Route[] = [
  { method: 'GET', path: '/openapi.json', operation: 'getOpenApi', summary: 'This document.', access: 'everybody', status: 200, answer: z.record(z.string(), z.unknown()) },

  { method: 'POST', path: '/session', operation: 'signIn', summary: 'Sign in: sets the session cookie.', access: 'everybody', body: signInSchema, status: 204 },
  { method: 'DELETE', path: '/session', operation: 'signOut', summary: 'Sign out: ends the session.', access: 'everybody', status: 204 },
  { method: 'GET', path: '/me', operation: 'getMe', summary: 'Who is signed in, with the roles in each team.', access: 'signed-in', status: 200, answer: meSchema },
  { method: 'PUT', path: '/me/password', operation: 'changePassword', summary: 'Change the password; every other session of the person ends.', access: 'signed-in', body: changePasswordSchema, status: 204 },

  { method: 'GET', path: '/teams', operation: 'listTeams', summary: 'Teams of the person.', access: 'signed-in', status: 200, answer: listOf(teamSchema) },
  { method: 'POST', path: '/teams', operation: 'createTeam', summary: 'New team, with the person as its administrator.', access: 'signed-in', body: createTeamSchema, status: 201, answer: teamSchema },
  { method: 'GET', path: '/teams/{teamId}', operation: 'getTeam', summary: 'One team.', access: 'team.read', status: 200, answer: teamSchema },
  { method: 'GET', path: '/teams/{teamId}/members', operation: 'listMembers', summary: 'People of a team and their roles.', access: 'team.read', status: 200, answer: listOf(memberSchema) },
  { method: 'POST', path: '/teams/{teamId}/members', operation: 'addMember', summary: 'Add a person. Somebody without an account gets one with a one-time password, shown once.', access: 'member.manage', body: addMemberSchema, status: 201, answer: addedMemberSchema },
  { method: 'PATCH', path: '/teams/{teamId}/members/{userId}', operation: 'changeMemberRole', summary: 'Change a role.', access: 'member.manage', body: changeRoleSchema, status: 200, answer: memberSchema },
  { method: 'DELETE', path: '/teams/{teamId}/members/{userId}', operation: 'removeMember', summary: 'Remove a person from the team.', access: 'member.manage', status: 204 },
  { method: 'GET', path: '/teams/{teamId}/jobs', operation: 'listJobs', summary: 'Jobs of a team, newest first.', access: 'job.read', query: list, status: 200, answer: listOf(jobSchema) },

  { method: 'GET', path: '/teams/{teamId}/studies', operation: 'listStudies', summary: 'Studies of a team, newest first.', access: 'study.read', query: list, status: 200, answer: listOf(studySchema) },
  { method: 'POST', path: '/teams/{teamId}/studies', operation: 'createStudy', summary: 'New study with its correlation model.', access: 'study.write', body: createStudySchema, status: 201, answer: studySchema },
  { method: 'GET', path: '/studies/{studyId}', operation: 'getStudy', summary: 'One study.', access: 'study.read', status: 200, answer: studySchema },
  { method: 'PATCH', path: '/studies/{studyId}', operation: 'updateStudy', summary: 'Change name, description or correlation model. Versions keep the model that they were saved with.', access: 'study.write', body: updateStudySchema, status: 200, answer: studySchema },
  { method: 'DELETE', path: '/studies/{studyId}', operation: 'deleteStudy', summary: 'Delete a study that has no version, with its observation sets and designs.', access: 'study.write', status: 204 },

  { method: 'GET', path: '/studies/{studyId}/observation-sets', operation: 'listObservationSets', summary: 'Observation sets of a study, newest first.', access: 'observations.read', query: list, status: 200, answer: listOf(observationSetSchema) },
  { method: 'POST', path: '/studies/{studyId}/observation-sets', operation: 'createObservationSet', summary: 'Upload a file: CSV or GeoJSON points. The job’s result is {observationSetId, rowsRead, accepted, rejectedCount}.', access: 'observations.write', isUpload: true, status: 202, answer: jobSchema },
  { method: 'GET', path: '/observation-sets/{setId}', operation: 'getObservationSet', summary: 'One observation set, with the SHA-256 of its file.', access: 'observations.read', status: 200, answer: observationSetSchema },
  { method: 'DELETE', path: '/observation-sets/{setId}', operation: 'deleteObservationSet', summary: 'Delete a set that no design and no version uses, with its file.', access: 'observations.write', status: 204 },
  { method: 'GET', path: '/observation-sets/{setId}/points', operation: 'listPoints', summary: 'Accepted rows, sorted and filtered, page by offset.', access: 'observations.read', query: pointsQuerySchema, status: 200, answer: pointsPageSchema },
  { method: 'GET', path: '/observation-sets/{setId}/columns', operation: 'getColumnsBundle', summary: 'Accepted rows column by column, as an array bundle.', access: 'observations.read', status: 200, media: binary },
  { method: 'GET', path: '/observation-sets/{setId}/rejected', operation: 'listRejected', summary: 'Rejected rows with line, field and reason: a page as JSON, or all as CSV.', access: 'observations.read', query: rejectedQuerySchema, status: 200, answer: listOf(rejectedRowSchema), media: ['text/csv'] },
  { method: 'GET', path: '/observation-sets/{setId}/original', operation: 'openOriginal', summary: 'The uploaded file, byte for byte.', access: 'observations.read', status: 200, media: binary },

  { method: 'GET', path: '/studies/{studyId}/designs', operation: 'listDesigns', summary: 'Designs of a study, newest first.', access: 'design.read', query: list, status: 200, answer: listOf(designSchema) },
  { method: 'POST', path: '/studies/{studyId}/designs', operation: 'createDesign', summary: 'New design; without a recipe it starts from one derived from the observations and the model.', access: 'design.write', body: createDesignSchema, status: 201, answer: designSchema },
  { method: 'GET', path: '/designs/{designId}', operation: 'getDesign', summary: 'One design.', access: 'design.read', status: 200, answer: designSchema },
  { method: 'PATCH', path: '/designs/{designId}', operation: 'updateDesign', summary: 'Change a design that still has the given revision; else 409 DESIGN_CHANGED with the newer design in details.current.', access: 'design.write', body: updateDesignSchema, status: 200, answer: designSchema },
  { method: 'DELETE', path: '/designs/{designId}', operation: 'deleteDesign', summary: 'Delete a design; versions saved from it stay.', access: 'design.write', status: 204 },
  { method: 'GET', path: '/designs/{designId}/checks', operation: 'getLastCheck', summary: 'Result of the newest successful check, or null.', access: 'design.read', status: 200, answer: checkResultSchema.nullable() },
  { method: 'POST', path: '/designs/{designId}/checks', operation: 'startCheck', summary: 'Rebuild and check the design as it stands. The job’s result is a check result.', access: 'design.write', status: 202, answer: jobSchema },
  { method: 'POST', path: '/designs/{designId}/versions', operation: 'startSaveVersion', summary: 'Rebuild, check and save as the study’s next version. The job fails with FINDINGS_FAIL while a finding fails and no reason is given; its result is {versionId, number, meshHash}.', access: 'version.write', body: saveVersionSchema, status: 202, answer: jobSchema },

  { method: 'GET', path: '/studies/{studyId}/versions', operation: 'listVersions', summary: 'Mesh versions of a study, newest first.', access: 'version.read', query: list, status: 200, answer: listOf(versionSummarySchema) },
  { method: 'GET', path: '/versions/{versionId}', operation: 'getVersion', summary: 'One mesh version with recipe, findings and figures.', access: 'version.read', status: 200, answer: versionSchema },
  { method: 'GET', path: '/versions/{versionId}/findings', operation: 'listFindings', summary: 'Findings that the version was saved with.', access: 'version.read', status: 200, answer: listOf(findingSchema) },
  { method: 'GET', path: '/versions/{versionId}/mesh', operation: 'getMeshBundle', summary: 'Mesh and observations of a version, as an array bundle.', access: 'version.read', status: 200, media: binary },
  { method: 'POST', path: '/versions/{versionId}/rebuild', operation: 'startRebuild', summary: 'Make the mesh again from the original file and the recipe, in a process of its own. The job’s result is {expectedHash, rebuiltHash, reproduced, observationSha256}.', access: 'version.read', status: 202, answer: jobSchema },
  { method: 'GET', path: '/versions/{versionId}/exports', operation: 'listExports', summary: 'Files that a version is handed over in, with their SHA-256.', access: 'version.read', status: 200, answer: listOf(exportSchema) },
  { method: 'GET', path: '/versions/{versionId}/exports/{format}', operation: 'openExport', summary: 'One export: the same bytes every time.', access: 'version.read', status: 200, media: ['application/netcdf', 'application/zip', 'application/geo+json'] },

  { method: 'GET', path: '/jobs/{jobId}', operation: 'getJob', summary: 'One job as it stands.', access: 'job.read', status: 200, answer: jobSchema },
  { method: 'GET', path: '/jobs/{jobId}/events', operation: 'jobEvents', summary: 'Server-sent events: `job` with the job as JSON at once and at each change.', access: 'job.read', status: 200, media: ['text/event-stream'] },
  { method: 'POST', path: '/jobs/{jobId}/cancel', operation: 'cancelJob', summary: 'Cancel a job: at once while it waits, soon while it runs.', access: 'job.control', status: 200, answer: jobSchema },
];
