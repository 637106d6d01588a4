/** The OpenAPI 3.1 document, from the same definitions that serve and validate. */
import {
  type MediaTypeObject,
  type OpenAPIObject,
  OpenApiBuilder,
  type OperationObject,
  type ParameterObject,
  type ResponseObject,
  type SchemaObject,
} from 'openapi3-ts/oas31';
import { z } from 'zod';
import { PROBLEM_TYPES } from '../service/problem.ts';
import type { MultipartForm, RouteDefinition } from '../service/route.ts';
import { ROUTES } from '../service/routes/index.ts';
import { BODIES } from '../service/schemas/bodies.ts';

type JsonSchema = Record<string, unknown>;

const DESCRIPTION = `Rates per ionization bin and the exposure that tests a hypothesis of sub-GeV dark matter in a crystal.
Every number is a planning estimate; the collaboration's own analysis of its detector takes precedence.

Quantities come in as "10 MeV" or {"value": 10, "unit": "MeV"} in any compatible unit and go out in fixed units.
Unknown fields are refused. Request bodies may be compressed with gzip.`;

const TAGS = {
  rates: 'Rates and exposure',
  reach: 'Reach curves and comparisons',
  crystals: 'Crystal form factor tables',
  'charge tables': 'Ionization models given as tables',
  halo: 'The dark-matter halo',
  service: 'The service itself',
};

const PROBLEM: SchemaObject = {
  type: 'object',
  description: 'RFC 9457 problem details.',
  required: ['type', 'title', 'status', 'detail'],
  properties: {
    type: { type: 'string', enum: Object.keys(PROBLEM_TYPES).map((type) => `/problems/${type}`) },
    title: { type: 'string' },
    status: { type: 'integer' },
    detail: { type: 'string' },
    errors: {
      type: 'array',
      maxItems: 50,
      description: 'Every fault of the input, at most 50.',
      items: {
        type: 'object',
        required: ['detail'],
        properties: {
          pointer: { type: 'string', description: 'RFC 6901 pointer into the body.' },
          parameter: { type: 'string', description: 'Name of a query or path parameter.' },
          detail: { type: 'string' },
        },
      },
    },
  },
};

function matrixOf(isPositive: boolean): JsonSchema {
  const items = { type: 'number', ...(isPositive ? { minimum: 0 } : {}) };
  return { type: 'array', minItems: 2, items: { type: 'array', minItems: 2, items } };
}

/** JSON Schemas of everything named, and of `schema` itself: components by their id, so that nothing is written twice. */
function jsonSchema(schema: z.ZodType, io: 'input' | 'output', components: Map<string, JsonSchema>): SchemaObject {
  const whole = z.toJSONSchema(schema, {
    io,
    unrepresentable: 'any',
    target: 'draft-2020-12',
    override: ({ zodSchema, jsonSchema }) => {
      if (zodSchema._zod.def.type === 'custom') Object.assign(jsonSchema, matrixOf(jsonSchema['id'] !== 'RealMatrix'));
    },
  }) as JsonSchema & { $defs?: Record<string, JsonSchema> };
  const { $schema: _schema, $defs = {}, ...own } = whole;
  for (const [id, definition] of Object.entries($defs)) components.set(id, refer(definition) as JsonSchema);
  const id = typeof own['id'] === 'string' ? own['id'] : undefined;
  if (id === undefined) return refer(own) as SchemaObject;
  components.set(id, refer(own) as JsonSchema);
  return { $ref: `#/components/schemas/${id}` } as SchemaObject;
}

/** `$defs` become components; `id` was only their name. */
function refer(value: unknown): unknown {
  if (Array.isArray(value)) return value.map(refer);
  if (typeof value !== 'object' || value === null) return value;
  return Object.fromEntries(
    Object.entries(value)
      .filter(([key, inner]) => !(key === 'id' && typeof inner === 'string'))
      .map(([key, inner]) => [
        key,
        key === '$ref' ? String(inner).replace('#/$defs/', '#/components/schemas/') : refer(inner),
      ]),
  );
}

function responsesOf(route: RouteDefinition, components: Map<string, JsonSchema>): Record<string, ResponseObject> {
  const responses: Record<string, ResponseObject> = {};
  for (const [status, { description, schema, mediaType, otherMediaTypes = [], headers }] of Object.entries(
    route.responses,
  )) {
    const media: MediaTypeObject = schema ? { schema: jsonSchema(schema, 'output', components) } : {};
    responses[status] = {
      description,
      ...(headers
        ? {
            headers: Object.fromEntries(
              Object.entries(headers).map(([name, text]) => [name, { description: text, schema: { type: 'string' } }]),
            ),
          }
        : {}),
      ...(schema
        ? {
            content: {
              [mediaType ?? 'application/json']: media,
              ...Object.fromEntries(otherMediaTypes.map((type) => [type, { schema: { type: 'string' as const } }])),
            },
          }
        : {}),
    };
  }
  for (const type of [...route.problems, 'internal' as const]) {
    const { status, title } = PROBLEM_TYPES[type];
    responses[status] = {
      description: `${title}: /problems/${type}`,
      content: { 'application/problem+json': { schema: { $ref: '#/components/schemas/Problem' } } },
    };
  }
  return responses;
}

/** A form of a description in JSON and a file. */
function formOf({ description, values }: MultipartForm, components: Map<string, JsonSchema>): MediaTypeObject {
  return {
    schema: {
      type: 'object',
      required: ['description', 'values'],
      properties: {
        description: jsonSchema(description, 'input', components),
        values: { type: 'string', format: 'binary', description: values },
      },
    },
    encoding: {
      description: { contentType: 'application/json' },
      values: { contentType: 'application/octet-stream, text/csv, application/gzip' },
    },
  };
}

function operationOf(route: RouteDefinition, components: Map<string, JsonSchema>): OperationObject {
  const parameters: ParameterObject[] = Object.entries(route.parameters ?? {}).map(([name, description]) => ({
    name,
    in: 'path',
    required: true,
    description,
    schema: { type: 'string' },
    ...(route.parameterExamples?.[name] === undefined ? {} : { example: route.parameterExamples[name] }),
  }));
  return {
    operationId: route.operationId,
    tags: [route.tag],
    summary: route.summary,
    ...(route.description ? { description: route.description } : {}),
    ...(parameters.length > 0 ? { parameters } : {}),
    ...(route.body
      ? {
          requestBody: {
            required: true,
            content: {
              'application/json': {
                schema: jsonSchema(BODIES[route.body], 'input', components),
                ...(route.examples ? { examples: { ...route.examples } } : {}),
              },
              ...(route.multipart ? { 'multipart/form-data': formOf(route.multipart, components) } : {}),
            },
          },
        }
      : {}),
    responses: responsesOf(route, components),
  };
}

function openApiDocument(version: string): OpenAPIObject {
  const builder = OpenApiBuilder.create()
    .addOpenApiVersion('3.1.0')
    .addInfo({
      title: 'gramyear',
      version,
      description: DESCRIPTION,
      license: { name: 'Apache-2.0', identifier: 'Apache-2.0' },
    })
    .addServer({ url: '/' });
  for (const [name, description] of Object.entries(TAGS)) builder.addTag({ name, description });
  const components = new Map<string, JsonSchema>([['Problem', PROBLEM as JsonSchema]]);
  const paths = new Map<string, Record<string, OperationObject>>();
  for (const route of ROUTES) {
    const item = paths.get(route.path) ?? {};
    item[route.method] = operationOf(route, components);
    paths.set(route.path, item);
  }
  for (const [path, item] of paths) builder.addPath(path, item);
  for (const [id, schema] of [...components].sort(([a], [b]) => (a < b ? -1 : 1)))
    builder.addSchema(id, schema as SchemaObject);
  return { ...builder.getSpec(), security: [] };
}

/** The document as it is committed. */
export function documentText(version: string): string {
  return `${JSON.stringify(openApiDocument(version), null, 2)}\n`;
}
