# A static binary in an empty image, run by nobody in particular, that checks its own health.
ARG GO_IMAGE=golang:1.26
ARG VERSION=0.1.0

FROM ${GO_IMAGE} AS build
WORKDIR /src
COPY go.mod go.sum ./
RUN go mod download
COPY . .
ARG VERSION
RUN CGO_ENABLED=0 go build -trimpath -ldflags "-s -w -X main.version=${VERSION}" -o /guardrow ./cmd/guardrow

FROM scratch
ARG VERSION
LABEL org.opencontainers.image.title="guardrow" \
      org.opencontainers.image.version="${VERSION}" \
      org.opencontainers.image.description="Tells a laboratory what its study can and cannot test, and analyses it afterwards"
COPY --from=build /guardrow /guardrow
USER 65532:65532
ENV GUARDROW_LISTEN=0.0.0.0:8080
EXPOSE 8080
HEALTHCHECK --interval=10s --timeout=6s --start-period=5s CMD ["/guardrow", "healthcheck"]
ENTRYPOINT ["/guardrow"]
CMD ["serve"]
