# Node 24 is the maintained long-term release. DuckDB is built for glibc, so the image is not Alpine.
ARG NODE_IMAGE=node:24-bookworm-slim

FROM ${NODE_IMAGE} AS build
WORKDIR /app
COPY package.json package-lock.json ./
# No package runs a script of its own; the build is one step that can be seen below.
RUN npm ci --ignore-scripts --no-audit --no-fund
COPY tsconfig.json tsconfig.build.json ./
COPY src ./src
RUN npm run build
RUN npm prune --omit=dev --ignore-scripts --no-audit --no-fund

FROM ${NODE_IMAGE} AS run
ARG VERSION=0.1.0
ARG REVISION=unknown
LABEL org.opencontainers.image.title="yawledger" \
      org.opencontainers.image.description="Replays wind-turbine SCADA yaw logs and scores misalignment" \
      org.opencontainers.image.version="${VERSION}" \
      org.opencontainers.image.revision="${REVISION}"
# Four running queries would block all file I/O of a pool of four, so the pool is larger from the start.
ENV NODE_ENV=production \
    UV_THREADPOOL_SIZE=16 \
    YAWLEDGER_HOST=0.0.0.0 \
    YAWLEDGER_PORT=8080 \
    YAWLEDGER_DATA_FOLDER=/data
WORKDIR /app
RUN mkdir /data && chown node:node /data
COPY --from=build /app/package.json ./
COPY --from=build /app/node_modules ./node_modules
COPY --from=build /app/dist ./dist
COPY data-demo ./data-demo
USER node
VOLUME /data
EXPOSE 8080
HEALTHCHECK --interval=30s --timeout=5s --start-period=20s --retries=3 \
  CMD ["node", "-e", "fetch(`http://127.0.0.1:${process.env.YAWLEDGER_PORT}/health/ready`).then((a) => process.exit(a.ok ? 0 : 1), () => process.exit(1))"]
ENTRYPOINT ["node", "dist/main.js"]
CMD ["serve"]
