# The monitor as a container: no root, a file system that may be read-only, state on a volume.
FROM node:20.19.5-bookworm-slim AS dependencies
WORKDIR /app
COPY package.json package-lock.json .npmrc ./
RUN npm ci --omit=dev --ignore-scripts

FROM node:20.19.5-bookworm-slim AS build
WORKDIR /app
COPY package.json package-lock.json .npmrc ./
RUN npm ci --ignore-scripts
COPY tsconfig.json tsconfig.build.json ./
COPY src ./src
COPY demo-feeds ./demo-feeds
RUN npm run build

FROM node:20.19.5-bookworm-slim
ENV NODE_ENV=production
WORKDIR /app
COPY --from=dependencies /app/node_modules ./node_modules
COPY --from=build /app/dist ./dist
COPY package.json LICENSE README.md ./
COPY config ./config
COPY schema ./schema
RUN mkdir -p /var/lib/tautline && chown node:node /var/lib/tautline
USER node
VOLUME /var/lib/tautline
EXPOSE 8450
HEALTHCHECK --interval=10s --timeout=3s --start-period=20s --retries=3 \
  CMD ["node", "-e", "fetch('http://127.0.0.1:8450/health/live').then((answer) => process.exit(answer.ok ? 0 : 1), () => process.exit(1))"]
ENTRYPOINT ["node", "/app/dist/src/cli.js"]
CMD ["watch", "--settings", "/etc/tautline/settings.yaml"]
